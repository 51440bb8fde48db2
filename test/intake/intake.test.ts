import { createHmac } from 'node:crypto';
import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import type { UrlEvent } from '../../src/handlers/url-event.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { queues, settings } from './desk.ts';

const nowMs = Date.parse('2026-03-02T09:00:00Z');
const newSecret = `whsec_${Buffer.from('a new secret of 24 bytes').toString('base64')}`;
const oldSecret = `whsec_${Buffer.from('the old one, 24 bytes...').toString('base64')}`;

function setUp(
  store: Store = createMemoryStore(),
  webhookSecrets: readonly string[] = [newSecret, oldSecret],
) {
  const lines: unknown[] = [];
  let draws = 0;
  const handle = createIntakeHandler({
    world: { store, nowMs: () => nowMs, random: () => (draws++ % 1000) / 1000 },
    loadDesk: async () => ({ settings, queues, webhookSecrets }),
    log: (line) => lines.push(line),
  });
  return { store, handle, lines };
}

async function keysOf(store: Store): Promise<string[]> {
  const found: string[] = [];
  for await (const one of store.list('')) found.push(one.key);
  return found;
}

function post(rawPath: string, body: string | Uint8Array, headers: Record<string, string> = {}): UrlEvent {
  return {
    rawPath,
    headers: { 'content-type': 'application/json', ...headers },
    body: Buffer.from(body).toString('base64'),
    isBase64Encoded: true,
    requestContext: { requestId: 'trace-1', http: { method: 'POST' } },
  };
}

/** Standard Webhooks 1.0.0: HMAC-SHA256 over `id.timestamp.body`, base64, after `v1,`. Written out here on its own. */
function signed(
  body: string,
  more: { secret?: string; id?: string; atMs?: number; headers?: Record<string, string> } = {},
): UrlEvent {
  const { secret = newSecret, id = 'msg_1', atMs = nowMs } = more;
  const seconds = String(Math.floor(atMs / 1000));
  const key = Buffer.from(secret.slice('whsec_'.length), 'base64');
  const signature = createHmac('sha256', key).update(`${id}.${seconds}.${body}`).digest('base64');
  return post('/confirmations', body, {
    'webhook-id': id,
    'webhook-timestamp': seconds,
    'webhook-signature': `v1,${signature}`,
    ...more.headers,
  });
}

const confirmation = {
  case: { externalId: 'forms/contact/2026-03-02/x.json', team: { name: 'Billing Team' } },
  actor: { login: 'jo' },
  occurredAt: '2026-03-02T08:59:30Z',
};
/** A document that a test may spoil at will. */
// biome-ignore lint/suspicious/noExplicitAny: a spoilt document has no type
type Loose = any;
const withChange = (change: (value: Loose) => void): string => {
  const value = structuredClone(confirmation);
  change(value);
  return JSON.stringify(value);
};
const goodForm = { topic: 'bill', email: 'pat@home.example', message: 'My bill is too high.' };
const form = (change: Record<string, unknown>): string => JSON.stringify({ ...goodForm, ...change });
const nested = (depth: number): string => `{"a":${'['.repeat(depth)}${']'.repeat(depth)}}`;

beforeEach(() => {
  vi.useFakeTimers({ now: nowMs, toFake: ['Date'] });
});
afterEach(() => {
  vi.useRealTimers();
});

describe('forms', () => {
  it('stores a JSON submission as a form document under inbound/', async () => {
    const { store, handle, lines } = setUp();
    const result = await handle(post('/forms/contact', JSON.stringify(goodForm)));
    expect(result.statusCode).toBe(202);
    const { message } = JSON.parse(result.body);
    expect(message).toMatch(/^forms\/contact\/2026-03-02\/2026-03-02T09-00-00-000Z-[0-9a-z]{14}\.json$/);
    const got = await store.get(`inbound/${message}`);
    if (got.kind !== 'found') throw new Error('nothing stored');
    expect(JSON.parse(Buffer.from(got.object.body).toString())).toEqual({
      form: 'contact',
      at: '2026-03-02T09:00:00.000Z',
      from: 'pat@home.example',
      fields: { topic: 'bill', message: 'My bill is too high.' },
    });
    expect(got.object.metadata).toEqual({ 'tallypost-trace': 'trace-1' });
    expect(lines).toEqual([
      { event: 'intake', level: 'info', status: 202, trace: 'trace-1', stored: `inbound/${message}` },
    ]);
  });

  it('writes no trace that could not stand in metadata', async () => {
    for (const requestId of ['', 'a\r\nb', 'ü', 'x'.repeat(65)]) {
      const { store, handle, lines } = setUp();
      const event = post('/forms/contact', JSON.stringify(goodForm));
      const result = await handle({ ...event, requestContext: { ...event.requestContext, requestId } });
      expect(result.statusCode).toBe(202);
      expect((await store.head((await keysOf(store))[0]!))!.metadata).toEqual({});
      expect(lines).toMatchObject([{ trace: '' }]);
    }
  });

  it('stores a form-encoded submission and sends the browser on', async () => {
    const { store, handle } = setUp();
    const result = await handle(
      post('/forms/meter', 'reading=00123', {
        'content-type': 'application/x-www-form-urlencoded; charset=utf-8',
      }),
    );
    expect(result.statusCode).toBe(303);
    expect(result.headers.location).toBe('https://www.fenmarkwater.example/thanks');
    expect(await keysOf(store)).toHaveLength(1);
  });

  it('stores a submission that looks machine-made with its suspicion, where the desk holds such', async () => {
    const { store, handle } = setUp();
    for (const body of [form({ website: 'http://x.example' }), form({ shownAt: nowMs - 1000 })]) {
      expect((await handle(post('/forms/contact', body))).statusCode).toBe(202);
    }
    const suspicions: string[] = [];
    for (const key of await keysOf(store)) {
      const got = await store.get(key);
      if (got.kind === 'found')
        suspicions.push(JSON.parse(Buffer.from(got.object.body).toString()).suspicion);
    }
    expect(suspicions.sort()).toEqual(['sent-too-soon', 'trap-filled']);
  });

  it('lets a listed origin read the answer, and answers its preflight', async () => {
    const { handle } = setUp();
    const origin = 'https://www.fenmarkwater.example';
    const answer = await handle(post('/forms/contact', JSON.stringify(goodForm), { origin }));
    expect(answer.headers['access-control-allow-origin']).toBe(origin);
    const preflight = await handle({
      rawPath: '/forms/contact',
      headers: { origin },
      requestContext: { http: { method: 'OPTIONS' } },
    });
    expect([preflight.statusCode, preflight.headers['access-control-allow-methods']]).toEqual([204, 'POST']);
  });

  it('takes white space and line ends inside a message as they are', async () => {
    const { store, handle } = setUp();
    await handle(post('/forms/contact', form({ message: 'one\r\ntwo\tthree' })));
    const got = await store.get((await keysOf(store))[0]!);
    if (got.kind !== 'found') throw new Error('nothing stored');
    expect(JSON.parse(Buffer.from(got.object.body).toString()).fields.message).toBe('one\r\ntwo\tthree');
  });
});

describe('confirmations', () => {
  it('drops a signed confirmation, mapped by the pointers, under confirmations/', async () => {
    const { store, handle } = setUp();
    const result = await handle(signed(JSON.stringify(confirmation)));
    expect([result.statusCode, JSON.parse(result.body).taken]).toEqual([202, 'now']);
    const dropKey = (await keysOf(store)).find((key) => key.startsWith('confirmations/'))!;
    const got = await store.get(dropKey);
    if (got.kind !== 'found') throw new Error('nothing dropped');
    expect(JSON.parse(Buffer.from(got.object.body).toString())).toEqual({
      message: 'forms/contact/2026-03-02/x.json',
      queue: 'billing',
      by: 'jo',
      at: '2026-03-02T08:59:30.000Z',
    });
  });

  it('takes either of two secrets while one is being replaced, and neither once both are gone', async () => {
    const body = JSON.stringify(confirmation);
    expect((await setUp().handle(signed(body, { secret: oldSecret }))).statusCode).toBe(202);
    expect(
      (await setUp(createMemoryStore(), [newSecret]).handle(signed(body, { secret: oldSecret }))).statusCode,
    ).toBe(401);
    expect((await setUp(createMemoryStore(), []).handle(signed(body))).statusCode).toBe(503);
  });

  it('stores nothing when the same webhook comes again, also after its drop was folded away', async () => {
    const { store, handle } = setUp();
    await handle(signed(JSON.stringify(confirmation)));
    for (const key of await keysOf(store)) if (key.startsWith('confirmations/')) await store.delete(key);
    const again = await handle(signed(JSON.stringify(confirmation)));
    expect([again.statusCode, JSON.parse(again.body).taken]).toEqual([200, 'before']);
    expect((await keysOf(store)).filter((key) => key.startsWith('confirmations/'))).toEqual([]);
  });

  it('completes a webhook whose first attempt failed between the drop and its mark', async () => {
    const store = createMemoryStore();
    let failures = 1;
    const failing: Store = {
      ...store,
      put: async (key, body, options) => {
        if (key.startsWith('webhook-marks/') && failures-- > 0) throw new Error('lost connection');
        return store.put(key, body, options);
      },
    };
    const { handle } = setUp(failing);
    expect((await handle(signed(JSON.stringify(confirmation)))).statusCode).toBe(503);
    expect((await handle(signed(JSON.stringify(confirmation)))).statusCode).toBe(202);
    expect((await keysOf(store)).filter((key) => key.startsWith('confirmations/'))).toHaveLength(1);
  });
});

/** Every refusal: the request, the status, the problem's code. Nothing may be stored by any. */
const badForms: readonly (readonly [string, UrlEvent, number, string])[] = [
  [
    'body over the bound',
    post('/forms/contact', form({ message: 'x'.repeat(bounds.intakeFormBytesMax) })),
    413,
    'body-too-large',
  ],
  [
    'body over the bound, form-encoded',
    post('/forms/contact', `message=${'x'.repeat(bounds.intakeFormBytesMax)}`, {
      'content-type': 'application/x-www-form-urlencoded',
    }),
    413,
    'body-too-large',
  ],
  ['empty body', post('/forms/contact', ''), 400, 'json-unreadable'],
  ['cut JSON', post('/forms/contact', '{"topic":"bill"'), 400, 'json-unreadable'],
  ['JSON with a trailing comma', post('/forms/contact', '{"topic":"bill",}'), 400, 'json-unreadable'],
  [
    'JSON in UTF-16',
    post('/forms/contact', Buffer.from(JSON.stringify(goodForm), 'utf16le')),
    400,
    'json-unreadable',
  ],
  [
    'bytes that are not UTF-8',
    post('/forms/contact', Buffer.from([0x7b, 0xff, 0xfe, 0x7d])),
    400,
    'not-utf-8',
  ],
  ['overlong UTF-8', post('/forms/contact', Buffer.from([0x7b, 0xc0, 0xaf, 0x7d])), 400, 'not-utf-8'],
  ['deep JSON', post('/forms/contact', nested(10_000)), 400, 'json-too-deep'],
  ['JSON three levels deep', post('/forms/contact', nested(2)), 400, 'json-too-deep'],
  ['an array', post('/forms/contact', '[]'), 422, 'not-an-object'],
  ['a string', post('/forms/contact', '"hello"'), 422, 'not-an-object'],
  ['null', post('/forms/contact', 'null'), 422, 'not-an-object'],
  ['a number', post('/forms/contact', '7'), 422, 'not-an-object'],
  ['a field that is an object', post('/forms/contact', form({ message: {} })), 422, 'field-type'],
  ['a field that is an array', post('/forms/contact', form({ message: [] })), 422, 'field-type'],
  [
    'no content type',
    post('/forms/contact', JSON.stringify(goodForm), { 'content-type': '' }),
    415,
    'media-type',
  ],
  [
    'multipart',
    post('/forms/contact', 'x', { 'content-type': 'multipart/form-data; boundary=x' }),
    415,
    'media-type',
  ],
  [
    'plain text',
    post('/forms/contact', JSON.stringify(goodForm), { 'content-type': 'text/plain' }),
    415,
    'media-type',
  ],
  ['XML', post('/forms/contact', '<a/>', { 'content-type': 'application/xml' }), 415, 'media-type'],
  ['an undeclared field', post('/forms/contact', form({ colour: 'red' })), 422, 'fields'],
  [
    'a field named __proto__',
    post('/forms/contact', '{"topic":"bill","message":"m","__proto__":"x"}'),
    422,
    'fields',
  ],
  ['a field named constructor', post('/forms/contact', form({ constructor: 'x' })), 422, 'fields'],
  ['a field name with a line end', post('/forms/contact', form({ 'a\r\nb': 'x' })), 422, 'fields'],
  ['a required field missing', post('/forms/contact', '{"topic":"bill"}'), 422, 'fields'],
  ['a required field blank', post('/forms/contact', form({ message: ' \n ' })), 422, 'fields'],
  ['a required field null', post('/forms/contact', form({ message: null })), 422, 'fields'],
  ['a value outside the closed list', post('/forms/contact', form({ topic: 'BILL' })), 422, 'fields'],
  [
    'a closed value with a line end',
    post('/forms/contact', form({ topic: 'bill\r\nx-amz-meta-queue: y' })),
    422,
    'fields',
  ],
  ['a field over its length', post('/forms/contact', form({ message: 'm'.repeat(5001) })), 422, 'fields'],
  ['a NUL in a field', post('/forms/contact', form({ message: 'a\u0000b' })), 422, 'fields'],
  ['an escape character in a field', post('/forms/contact', form({ message: '\u001b[31m' })), 422, 'fields'],
  [
    'a sender with a line end',
    post('/forms/contact', form({ email: 'a@b.example\r\nBcc: c@d.example' })),
    422,
    'fields',
  ],
  ['a sender that is no address', post('/forms/contact', form({ email: 'pat' })), 422, 'fields'],
  [
    'a sender with two addresses',
    post('/forms/contact', form({ email: 'a@b.example,c@d.example' })),
    422,
    'fields',
  ],
  ['a sender in other letters', post('/forms/contact', form({ email: 'пат@дом.example' })), 422, 'fields'],
  [
    'a repeated field',
    post('/forms/meter', 'reading=1&reading=2', { 'content-type': 'application/x-www-form-urlencoded' }),
    422,
    'field-repeated',
  ],
  [
    'a filled trap where the desk refuses',
    post('/forms/meter', '{"reading":"1","website":"x"}'),
    422,
    'looks-automatic',
  ],
  [
    'sent too soon where the desk refuses',
    post('/forms/meter', `{"reading":"1","shownAt":${nowMs - 500}}`),
    422,
    'looks-automatic',
  ],
  [
    'shown in the future where the desk refuses',
    post('/forms/meter', `{"reading":"1","shownAt":${nowMs + 60_000}}`),
    422,
    'looks-automatic',
  ],
  ['an unknown form', post('/forms/other', '{}'), 404, 'no-such-form'],
  ['a form name with a slash', post('/forms/contact/extra', '{}'), 404, 'no-such-place'],
  ['a form name that climbs', post('/forms/..%2Fcontact', '{}'), 404, 'no-such-form'],
  ['no form name', post('/forms', '{}'), 404, 'no-such-place'],
  ['the root', post('/', '{}'), 404, 'no-such-place'],
  ['a path that is not percent-encoding', post('/forms/%zz', '{}'), 400, 'path'],
  [
    'GET of a form',
    { rawPath: '/forms/contact', requestContext: { http: { method: 'GET' } } },
    405,
    'method',
  ],
  [
    'DELETE of a form',
    { rawPath: '/forms/contact', requestContext: { http: { method: 'DELETE' } } },
    405,
    'method',
  ],
  [
    'another origin',
    post('/forms/contact', JSON.stringify(goodForm), { origin: 'https://evil.test' }),
    403,
    'origin',
  ],
  ['the origin null', post('/forms/contact', JSON.stringify(goodForm), { origin: 'null' }), 403, 'origin'],
  [
    'an origin that only begins alike',
    post('/forms/contact', JSON.stringify(goodForm), {
      origin: 'https://www.fenmarkwater.example.evil.test',
    }),
    403,
    'origin',
  ],
];

const good = JSON.stringify(confirmation);
const badConfirmations: readonly (readonly [string, () => UrlEvent, number, string])[] = [
  ['no signature', () => post('/confirmations', good), 401, 'signature'],
  [
    'another secret',
    () => signed(good, { secret: `whsec_${Buffer.from('somebody else').toString('base64')}` }),
    401,
    'signature',
  ],
  [
    'an altered body',
    () => ({ ...signed(good), body: Buffer.from(good.replace('jo', 'al')).toString('base64') }),
    401,
    'signature',
  ],
  ['an altered id', () => signed(good, { headers: { 'webhook-id': 'msg_2' } }), 401, 'signature'],
  ['a timestamp six minutes old', () => signed(good, { atMs: nowMs - 6 * 60_000 }), 401, 'signature'],
  ['a timestamp six minutes ahead', () => signed(good, { atMs: nowMs + 6 * 60_000 }), 401, 'signature'],
  [
    'a signature of another version',
    () => signed(good, { headers: { 'webhook-signature': 'v2,AAAA' } }),
    401,
    'signature',
  ],
  ['an empty signature', () => signed(good, { headers: { 'webhook-signature': 'v1,' } }), 401, 'signature'],
  [
    'a timestamp that is no number',
    () => signed(good, { headers: { 'webhook-timestamp': 'now' } }),
    401,
    'signature',
  ],
  [
    'a body over the bound',
    () => signed(`"${'x'.repeat(bounds.intakeWebhookBytesMax)}"`),
    413,
    'body-too-large',
  ],
  [
    'bytes that are not UTF-8',
    () => ({ ...signed(good), body: Buffer.from([0xff]).toString('base64') }),
    400,
    'not-utf-8',
  ],
  ['an id over its length', () => signed(good, { id: 'm'.repeat(257) }), 400, 'webhook-id'],
  ['an id with a space', () => signed(good, { id: 'msg 1' }), 400, 'webhook-id'],
  [
    'another media type',
    () => signed(good, { headers: { 'content-type': 'text/plain' } }),
    415,
    'media-type',
  ],
  ['deep JSON', () => signed(nested(5_000)), 400, 'json-too-deep'],
  ['cut JSON', () => signed('{"case":'), 400, 'json-unreadable'],
  ['a signed number', () => signed('7'), 422, 'not-an-object'],
  ['no message', () => signed(withChange((c) => delete c.case.externalId)), 422, 'confirmation'],
  [
    'a message that is an object',
    () =>
      signed(
        withChange((c) => {
          c.case.externalId = {};
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'a message with a line end',
    () =>
      signed(
        withChange((c) => {
          c.case.externalId = 'a\r\nb';
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'a message over its length',
    () =>
      signed(
        withChange((c) => {
          c.case.externalId = 'a'.repeat(901);
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'an unknown queue',
    () =>
      signed(
        withChange((c) => {
          c.case.team.name = 'gardening';
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'a queue named like a property of every object',
    () =>
      signed(
        withChange((c) => {
          c.case.team.name = 'toString';
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'a blank person',
    () =>
      signed(
        withChange((c) => {
          c.actor.login = '  ';
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'a time in words',
    () =>
      signed(
        withChange((c) => {
          c.occurredAt = 'yesterday';
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'a date without a time',
    () =>
      signed(
        withChange((c) => {
          c.occurredAt = '2026-03-02';
        }),
      ),
    422,
    'confirmation',
  ],
  [
    'the team missing',
    () =>
      signed(
        withChange((c) => {
          c.case.team = null;
        }),
      ),
    422,
    'confirmation',
  ],
  ['GET', () => ({ ...signed(good), requestContext: { http: { method: 'GET' } } }), 405, 'method'],
  ['a path below', () => ({ ...signed(good), rawPath: '/confirmations/x' }), 404, 'no-such-place'],
];

describe('what is refused', () => {
  const cases = [
    ...badForms.map(([name, event, ...rest]) => [`form: ${name}`, () => event, ...rest] as const),
    ...badConfirmations.map(([name, ...rest]) => [`confirmation: ${name}`, ...rest] as const),
  ];
  it.each(cases)('%s', async (_name, build, status, code) => {
    const { store, handle, lines } = setUp();
    const result = await handle(build());
    expect(result.statusCode).toBe(status);
    expect(result.headers['content-type']).toBe('application/problem+json');
    const body = JSON.parse(result.body);
    expect(body.type).toBe(`urn:tallypost:problem:${code}`);
    expect(body.status).toBe(status);
    expect(body.title).toMatch(/^[A-Z]/);
    expect(result.body.length).toBeLessThan(4096);
    for (const value of Object.values(result.headers)) expect(value).toMatch(/^[\x20-\x7e]*$/);
    expect(await keysOf(store)).toEqual([]);
    expect(lines).toHaveLength(1);
  });

  it('counts at least 60 refusals', () => {
    expect(cases.length).toBeGreaterThanOrEqual(60);
  });

  it('answers 503 and logs the fault when the store fails, without repeating what was sent', async () => {
    const failing: Store = {
      ...createMemoryStore(),
      put: async () => Promise.reject(new Error('no space, canary-text')),
    };
    const { handle, lines } = setUp(failing);
    const result = await handle(post('/forms/contact', form({ message: 'canary-text' })));
    expect(result.statusCode).toBe(503);
    expect(JSON.stringify([result, lines])).not.toContain('canary-text');
  });
});
