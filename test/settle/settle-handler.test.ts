import { beforeEach, describe, expect, it } from 'vitest';
import { createRouteHandler } from '../../src/handlers/route.ts';
import { createSettleHandler, type Finished, type SettleUrlResult } from '../../src/handlers/settle.ts';
import { linkTo } from '../../src/settle/link.ts';
import { heldOf } from '../../src/settle/pending.ts';
import { readSettleSecret } from '../../src/settle/secret.ts';
import { createMarkedWaitingList } from '../../src/settle/waiting-marks.ts';
import type { Store } from '../../src/store/store.ts';
import { openStation, type Station, teach } from '../handlers/station.ts';

const secret = Buffer.from('a secret of more than 32 characters');
const domain = 'abc123.lambda-url.eu-west-2.on.aws';
const url = new URL(`https://${domain}/`);
const hourMs = 3_600_000;

/** A request as a function URL hands it over: cookies apart, bodies in base64. */
function request(
  method: string,
  path: string,
  more: { headers?: Record<string, string>; cookie?: string; form?: Record<string, string> } = {},
) {
  const [rawPath, rawQueryString = ''] = path.split('?');
  const body = more.form && new URLSearchParams(more.form).toString();
  return {
    version: '2.0',
    rawPath,
    rawQueryString,
    headers: {
      host: domain,
      ...(method === 'POST' ? { origin: `https://${domain}`, 'sec-fetch-site': 'same-origin' } : {}),
      ...more.headers,
    },
    ...(more.cookie === undefined ? {} : { cookies: [more.cookie] }),
    ...(body === undefined ? {} : { body: Buffer.from(body).toString('base64'), isBase64Encoded: true }),
    requestContext: { requestId: 'r1', domainName: domain, http: { method } },
  };
}

describe('the page behind a function URL', () => {
  let station: Station;
  let handle: ReturnType<typeof createSettleHandler>;
  let held: string[];
  const ask = async (...given: Parameters<typeof request>) =>
    (await handle(request(...given))) as SettleUrlResult;
  const link = (by: string, more: { at?: URL; key?: Buffer; untilMs?: number; number?: string } = {}) =>
    linkTo(more.key ?? secret, {
      url: more.at ?? url,
      by,
      untilMs: more.untilMs ?? station.world.nowMs() + hourMs,
      number: more.number ?? `n${by}`,
    });
  const ticketOf = (text: string) => new URL(text).searchParams.get('t') as string;
  const comeIn = async (by: string) => {
    const reply = await ask('POST', '/enter', { form: { ticket: ticketOf(link(by)) } });
    expect(reply.statusCode).toBe(303);
    return reply.cookies[0]!.split(';')[0] as string;
  };
  const tokenIn = (body: string, action: string) =>
    /name="token" value="([^"]*)"/.exec(body.slice(body.indexOf(`action="${action}"`)))?.[1] ?? '';
  const viewOf = async (cookie: string, message: string) =>
    (await ask('GET', `/message?m=${encodeURIComponent(message)}`, { cookie })).body;

  beforeEach(async () => {
    station = await openStation();
    await teach(station);
    await station.compact({});
    const deps = { ...station.deps, isMarkingWaiting: true };
    const route = createRouteHandler(deps);
    held = [];
    // Words that no queue knows, so that all are held.
    for (const name of ['mail/one', 'mail/two', 'mail/three']) {
      const key = await station.putMail(name, 'Hello', `zebra ${name}`);
      await station.feed(route, key);
      station.pass(1000);
      if ((await station.metadata(key))['tallypost-decision'] === 'held') held.push(name);
    }
    handle = createSettleHandler(deps, secret);
  });

  it('has something to settle, which the router marked', async () => {
    expect(held).toEqual(['mail/one', 'mail/two', 'mail/three']);
    expect(await station.keys('waiting/')).toEqual([
      'waiting/mail/one',
      'waiting/mail/three',
      'waiting/mail/two',
    ]);
    expect((await createMarkedWaitingList(station.world).list()).map(({ message }) => message)).toEqual(held);
  });

  it('opens by a link to a door, and behind it by a cookie that no script and no other site can use', async () => {
    const door = await ask('GET', `/enter?t=${ticketOf(link('jo'))}`);
    expect([door.statusCode, door.cookies]).toEqual([200, []]);
    const inside = await ask('POST', '/enter', { form: { ticket: ticketOf(link('jo')) } });
    expect([inside.statusCode, inside.headers.location, inside.headers['set-cookie']]).toEqual([
      303,
      '/next',
      undefined,
    ]);
    expect(inside.cookies).toHaveLength(1);
    expect(inside.cookies[0]).toMatch(
      /^__Host-tallypost-settle=[\w.-]+; HttpOnly; SameSite=Strict; Path=\/; Max-Age=43200; Secure$/,
    );
    const next = await ask('GET', '/next', { cookie: inside.cookies[0]!.split(';')[0] as string });
    expect(next.headers.location).toBe('/message?m=mail%2Fone');
  });

  it.each<[string, () => string]>([
    ['expired', () => link('jo', { untilMs: station.world.nowMs() - 1 })],
    ['altered', () => `${link('jo').slice(0, -1)}${link('jo').endsWith('A') ? 'B' : 'A'}`],
    ['signed with another secret', () => link('jo', { key: Buffer.from('b'.repeat(40)) })],
    ['made for another desk’s page', () => link('jo', { at: new URL('https://other.lambda-url.on.aws/') })],
    [
      'with another person’s name put in',
      () => {
        const [body, code] = ticketOf(link('jo')).split('.') as [string, string];
        const forged = Buffer.from(Buffer.from(body, 'base64url').toString().replace('"jo"', '"al"'));
        return `https://${domain}/enter?t=${forged.toString('base64url')}.${code}`;
      },
    ],
  ])('refuses a link that is %s', async (_title, make) => {
    const ticket = ticketOf(make());
    for (const reply of [
      await ask('GET', `/enter?t=${ticket}`),
      await ask('POST', '/enter', { form: { ticket } }),
    ]) {
      expect([reply.statusCode, reply.cookies]).toEqual([403, []]);
      expect(reply.body).toContain('The link does not open');
    }
    expect(await station.keys('settling/')).toEqual([]);
  });

  it('opens a link once, also for two at the same time', async () => {
    const enter = () => ask('POST', '/enter', { form: { ticket: ticketOf(link('jo')) } });
    const statuses = (await Promise.all([enter(), enter(), enter()])).map(({ statusCode }) => statusCode);
    expect(statuses.sort()).toEqual([303, 403, 403]);
  });

  it('refuses the cookie of yesterday, and one of another purpose or person', async () => {
    const cookie = await comeIn('jo');
    expect((await ask('GET', '/', { cookie })).statusCode).toBe(200);
    expect((await ask('GET', '/', { cookie: cookie.replace('__Host-', '') })).statusCode).toBe(401);
    const token = tokenIn(await viewOf(cookie, 'mail/one'), '/settle');
    expect((await ask('GET', '/', { cookie: `__Host-tallypost-settle=${token}` })).statusCode).toBe(401);
    const other = await comeIn('al');
    const form = { message: 'mail/one', queue: 'billing', token };
    expect((await ask('POST', '/settle', { cookie: other, form })).statusCode).toBe(403);
    station.pass(12 * hourMs + 1);
    expect((await ask('GET', '/', { cookie })).statusCode).toBe(401);
  });

  it('settles by a post of its own page only', async () => {
    const cookie = await comeIn('jo');
    const form = {
      message: 'mail/one',
      queue: 'billing',
      token: tokenIn(await viewOf(cookie, 'mail/one'), '/settle'),
    };
    const refused: Record<string, string>[] = [
      { origin: 'https://evil.example' },
      { origin: 'null' },
      { origin: `http://${domain}` },
      { 'sec-fetch-site': 'cross-site' },
      { 'sec-fetch-site': 'same-site' },
      { origin: `https://${domain}.evil.example` },
    ];
    for (const headers of refused)
      expect(
        (await ask('POST', '/settle', { cookie, form, headers })).statusCode,
        JSON.stringify(headers),
      ).toBe(403);
    expect((await ask('GET', `/settle?${new URLSearchParams(form)}`, { cookie })).statusCode).toBe(404);
    expect(await heldOf(station.store, 'jo')).toBeNull();
    expect((await ask('POST', '/settle', { cookie, form })).headers.location).toBe('/message?m=mail%2Ftwo');
    expect(await heldOf(station.store, 'jo')).toMatchObject({ message: 'mail/one', queue: 'billing' });
  });

  it('takes the same post once, also when the message waits again', async () => {
    const cookie = await comeIn('jo');
    const form = {
      message: 'mail/one',
      queue: 'billing',
      token: tokenIn(await viewOf(cookie, 'mail/one'), '/settle'),
    };
    const settle = () => ask('POST', '/settle', { cookie, form });
    expect((await settle()).statusCode).toBe(303);
    expect((await settle()).statusCode).toBe(409);
    const undo = { message: 'mail/one', token: tokenIn(await viewOf(cookie, 'mail/two'), '/undo') };
    expect((await ask('POST', '/undo', { cookie, form: undo })).statusCode).toBe(303);
    expect(await heldOf(station.store, 'jo')).toBeNull();
    expect((await settle()).statusCode).toBe(403);
    expect(await heldOf(station.store, 'jo')).toBeNull();
  });

  it('drops what a helpdesk would drop, by the next one or by the schedule, and forgets what is settled', async () => {
    const cookie = await comeIn('jo');
    const settle = async (message: string, queue: string) => {
      const token = tokenIn(await viewOf(cookie, message), '/settle');
      return ask('POST', '/settle', { cookie, form: { message, queue, token } });
    };
    await settle('mail/one', 'billing');
    await settle('mail/two', 'leaks');
    const drops = await station.keys('confirmations/');
    expect(drops).toHaveLength(1);
    expect(await station.json(drops[0]!)).toMatchObject({ message: 'mail/one', queue: 'billing', by: 'jo' });
    expect(((await handle({ source: 'aws.scheduler' })) as Finished).dropped).toBe(0);
    station.pass(600_000);
    expect(((await handle({ source: 'aws.scheduler' })) as Finished).dropped).toBe(1);
    await station.feed(station.confirm, ...(await station.keys('confirmations/')));
    expect((await station.keys('histories/mail/')).sort()).toEqual([
      'histories/mail/one.json',
      'histories/mail/two.json',
    ]);
    const list = await ask('GET', '/', { cookie });
    expect(list.body).toContain('1 message waits for a person');
    expect(await station.keys('waiting/')).toEqual(['waiting/mail/three']);
    // Marks of links and tokens go when their time is over.
    expect((await station.keys('settling/used/')).length).toBe(3);
    station.pass(13 * hourMs);
    await handle({});
    expect(await station.keys('settling/used/')).toEqual([]);
  });

  it('reads no more of a request than one needs, and says of a failure nothing but that it is one', async () => {
    const cookie = await comeIn('jo');
    const long = await ask('POST', '/settle', { cookie, form: { message: 'x'.repeat(10_000) } });
    expect(long.statusCode).toBe(413);
    await station.putDesk('{"broken":');
    station.pass(120_000);
    const broken = await ask('GET', '/', { cookie });
    expect(broken.statusCode).toBe(503);
    expect(broken.body).toContain('desk-not-json');
    expect(station.log.at(-1)).toMatchObject({
      level: 'error',
      event: 'settle',
      status: 503,
      code: 'desk-not-json',
    });
  });

  it('reads large messages one at a time for the list, and small ones not all at once', async () => {
    const cookie = await comeIn('jo');
    const route = createRouteHandler({ ...station.deps, isMarkingWaiting: true });
    const large = `zebra ${'x'.repeat(1_100_000)}`;
    for (let i = 0; i < 40; i++)
      await station.feed(
        route,
        await station.putMail(`mail/more-${i}`, `Subject ${i}`, i < 4 ? large : `zebra ${i}`),
      );
    let [open, openLarge, most, mostLarge] = [0, 0, 0, 0];
    const store: Store = {
      ...station.store,
      async stream(key) {
        const found = await station.store.stream(key);
        const isLarge = (found?.head.bytes ?? 0) > 1_048_576;
        open += 1;
        if (isLarge) openLarge += 1;
        most = Math.max(most, open);
        mostLarge = Math.max(mostLarge, openLarge);
        return (
          found && {
            head: found.head,
            chunks: (async function* () {
              await new Promise((go) => setTimeout(go, 2));
              yield* found.chunks;
              open -= 1;
              if (isLarge) openLarge -= 1;
            })(),
          }
        );
      },
    };
    const watched = createSettleHandler({ ...station.deps, world: { ...station.world, store } }, secret);
    const list = (await watched(request('GET', '/', { cookie }))) as SettleUrlResult;
    expect(list.body).toContain('Subject 0');
    expect(list.body).toContain('Subject 39');
    expect([mostLarge, most > 1, most <= 16]).toEqual([1, true, true]);
  });

  it('sends what keeps a page to itself, with every answer', async () => {
    const cookie = await comeIn('jo');
    for (const reply of [
      await ask('GET', '/', { cookie }),
      await ask('GET', '/message?m=mail%2Fone', { cookie }),
      await ask('GET', '/nowhere', { cookie }),
      await ask('GET', '/'),
      await ask('GET', '/enter?t=x'),
    ]) {
      expect(reply.headers['content-security-policy']).toMatch(
        /^default-src 'none'; style-src 'sha256-[^']+'; script-src 'sha256-[^']+'; base-uri 'none'; form-action 'self'; frame-ancestors 'none'$/,
      );
      expect(reply.headers).toMatchObject({
        'cache-control': 'no-store',
        'referrer-policy': 'same-origin',
        'strict-transport-security': 'max-age=31536000',
        'x-content-type-options': 'nosniff',
      });
    }
  });

  it('writes no word, no message and no person to its log', async () => {
    const cookie = await comeIn('jo.unusual-name');
    await viewOf(cookie, 'mail/one');
    await ask('GET', '/message?m=mail%2Fnone', { cookie });
    const lines = station.log.filter(({ event }) => event === 'settle').map((line) => JSON.stringify(line));
    expect(lines.length).toBe(3);
    for (const line of lines) expect(line).not.toMatch(/zebra|mail\/|unusual/);
  });
});

describe('marks of waiting messages', () => {
  it('of messages that are gone, decided otherwise or settled are taken away; of those not yet decided stay', async () => {
    const station = await openStation();
    const deps = { ...station.deps, isMarkingWaiting: true };
    const route = createRouteHandler(deps);
    const mark = (name: string) => station.store.put(`waiting/${name}`, Buffer.from('2026'));
    await mark('mail/gone');
    await station.putMail('mail/fresh', 'Hello', 'not decided yet');
    await mark('mail/fresh');
    await station.putMail('mail/sent', 'Hello', 'World');
    const { etag } = (await station.store.head('inbound/mail/sent'))!;
    await station.store.replaceMetadata(
      'inbound/mail/sent',
      { 'tallypost-decision': 'routed', 'tallypost-queue': 'billing' },
      { ifMatch: etag },
    );
    await mark('mail/sent');
    await station.feed(route, await station.putMail('mail/held', 'Hello', 'World'));
    await station.feed(route, await station.putMail('mail/done', 'Hello', 'World'));
    await station.confirmAs('mail/done', 'billing');
    const waiting = createMarkedWaitingList(station.world);
    expect((await waiting.list()).map(({ message, why }) => [message, why])).toEqual([
      ['mail/held', 'nothing-learned'],
    ]);
    expect(await station.keys('waiting/')).toEqual(['waiting/mail/fresh', 'waiting/mail/held']);
    expect(waiting.beyond?.()).toBe(0);
  });

  it('are read as far as a page shows them, oldest first, and the rest is counted', async () => {
    const station = await openStation();
    const route = createRouteHandler({ ...station.deps, isMarkingWaiting: true });
    for (let i = 0; i < 450; i++) {
      await station.feed(route, await station.putMail(`mail/${i}`, 'Hello', `World ${i}`));
      station.pass(1000);
    }
    const waiting = createMarkedWaitingList(station.world);
    const listed = await waiting.list();
    expect([listed.length, listed[0]!.message, listed.at(-1)!.message]).toEqual([200, 'mail/0', 'mail/199']);
    expect(waiting.beyond?.()).toBe(250);
  });
});

describe('the secret of links', () => {
  it('is refused when it is missing or short', () => {
    expect(() => readSettleSecret(undefined)).toThrow('settle-secret-unusable');
    expect(() => readSettleSecret('x'.repeat(31))).toThrow('31 characters');
    expect(readSettleSecret(` ${'x'.repeat(32)}\n`)).toEqual(Buffer.from('x'.repeat(32)));
  });
});
