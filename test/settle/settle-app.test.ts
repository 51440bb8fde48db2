import { beforeAll, describe, expect, it } from 'vitest';
import { recount } from '../../src/ledger/recount.ts';
import { dropLeft, finishSettling, heldOf, holdSettlement, takeBack } from '../../src/settle/pending.ts';
import { createSettleApp, type SettleApp, type SettleRequest } from '../../src/settle/settle-app.ts';
import { readTicket, signTicket, ticketKeyOf } from '../../src/settle/ticket.ts';
import { createWaitingList } from '../../src/settle/waiting.ts';
import { keys } from '../../src/store/keys.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { playSmallDesk, type SmallDesk, smallTokenKey } from './small-desk.ts';

const origin = 'http://127.0.0.1:4000';
const key = ticketKeyOf(smallTokenKey);
const hourMs = 3_600_000;

function appOf(desk: SmallDesk, dropped: string[]): SettleApp {
  const { world } = desk;
  return createSettleApp({
    world,
    openBench: desk.openBench,
    readMessage: desk.readMessage,
    waiting: createWaitingList(world),
    ticketKey: key,
    origin,
    base: '',
    onDropped: async (drop) => void dropped.push(drop),
  });
}

function get(path: string, cookie = ''): SettleRequest {
  const url = new URL(path, origin);
  return {
    method: 'GET',
    path: url.pathname,
    query: url.searchParams,
    headers: { cookie },
    body: new Uint8Array(0),
  };
}

function post(
  path: string,
  form: Record<string, string>,
  cookie = '',
  headers: Record<string, string> = { origin },
): SettleRequest {
  return {
    method: 'POST',
    path,
    query: new URLSearchParams(),
    headers: { cookie, ...headers },
    body: Buffer.from(new URLSearchParams(form).toString()),
  };
}

/** Value of a hidden field in the first form that posts to `action`. */
function field(body: string, action: string, name: string): string {
  const form = body.slice(body.indexOf(`action="${action}"`));
  return new RegExp(`name="${name}" value="([^"]*)"`).exec(form)?.[1] ?? '';
}

async function comeIn(app: SettleApp, by: string, nowMs: number): Promise<string> {
  const ticket = signTicket(key, { purpose: 'enter', by, untilMs: nowMs + hourMs, about: `${by}-${nowMs}` });
  const reply = await app(post('/enter', { ticket }));
  expect(reply.status).toBe(303);
  return (reply.headers['set-cookie'] as string).split(';')[0] as string;
}

describe('tickets', () => {
  const ticket = { purpose: 'enter', by: 'Zoë · ops', untilMs: 2_000_000, about: 'x1' } as const;
  const text = signTicket(key, ticket);

  it('are read back whole before their time is over', () => {
    expect(readTicket(key, 'enter', text, 2_000_000)).toEqual({ kind: 'valid', ticket });
  });

  it('are refused when expired, altered in any letter, of another purpose or of another key', () => {
    expect(readTicket(key, 'enter', text, 2_000_001)).toEqual({ kind: 'refused', why: 'expired' });
    for (let i = 0; i < text.length; i += 1) {
      const other = text[i] === 'A' ? 'B' : 'A';
      const altered = text.slice(0, i) + other + text.slice(i + 1);
      expect(readTicket(key, 'enter', altered, 0), `letter ${i}`).toEqual({
        kind: 'refused',
        why: 'altered',
      });
    }
    expect(readTicket(key, 'session', text, 0)).toEqual({ kind: 'refused', why: 'altered' });
    expect(readTicket(ticketKeyOf(new Uint8Array(16)), 'enter', text, 0)).toEqual({
      kind: 'refused',
      why: 'altered',
    });
    for (const junk of ['', '.', 'a.b.c', `${text}.`, `${text}=`, 'x'.repeat(5000)]) {
      expect(readTicket(key, 'enter', junk, 0)).toEqual({ kind: 'refused', why: 'altered' });
    }
  });
});

describe('what can still be taken back', () => {
  const said = (message: string, at: string) => ({ message, queue: 'billing', by: 'a', at });

  it('is dropped with the next one, exactly as a helpdesk would', async () => {
    const store = createMemoryStore();
    const dropped: string[] = [];
    const onDropped = async (drop: string) => void dropped.push(drop);
    await holdSettlement(store, said('m1', '2026-03-01T10:00:00.000Z'), onDropped);
    expect(dropped).toEqual([]);
    expect(await heldOf(store, 'a')).toEqual(said('m1', '2026-03-01T10:00:00.000Z'));
    await holdSettlement(store, said('m2', '2026-03-01T10:01:00.000Z'), onDropped);
    expect(dropped).toHaveLength(1);
    const got = await store.get(dropped[0] as string);
    const body = got.kind === 'found' ? JSON.parse(Buffer.from(got.object.body).toString()) : null;
    expect(body).toEqual(said('m1', '2026-03-01T10:00:00.000Z'));
    expect(await takeBack(store, 'a')).toEqual(said('m2', '2026-03-01T10:01:00.000Z'));
    expect(await takeBack(store, 'a')).toBeNull();
    await finishSettling(store, 'a', onDropped);
    expect(dropped).toHaveLength(1);
  });

  it('is dropped by anybody once it is old, and never before', async () => {
    const store = createMemoryStore();
    const dropped: string[] = [];
    const onDropped = async (drop: string) => void dropped.push(drop);
    await holdSettlement(store, said('m1', '2026-03-01T10:00:00.000Z'), onDropped);
    const tenMs = Date.UTC(2026, 2, 1, 10);
    await dropLeft(store, tenMs + 599_000, 600_000, onDropped);
    expect(dropped).toEqual([]);
    await dropLeft(store, tenMs + 600_000, 600_000, onDropped);
    expect(dropped).toHaveLength(1);
  });

  it('is either taken back or dropped when both are asked for at once', async () => {
    for (let round = 0; round < 20; round += 1) {
      const store = createMemoryStore();
      const dropped: string[] = [];
      const onDropped = async (drop: string) => void dropped.push(drop);
      await holdSettlement(store, said('m1', '2026-03-01T10:00:00.000Z'), onDropped);
      const [taken] = await Promise.all(
        round % 2 === 0
          ? [takeBack(store, 'a'), finishSettling(store, 'a', onDropped)]
          : [finishSettling(store, 'a', onDropped).then(() => takeBack(store, 'a')), null],
      );
      expect((taken === null ? 0 : 1) + new Set(dropped).size).toBe(1);
    }
  });
});

describe('the page for held messages', () => {
  let desk: SmallDesk;
  const dropped: string[] = [];
  let app: SettleApp;
  let cookie = '';
  let nowMs = 0;

  beforeAll(async () => {
    desk = await playSmallDesk(240, 320);
    nowMs = Date.UTC(2026, 5, 1);
    desk.setNow(nowMs);
    app = appOf(desk, dropped);
    cookie = await comeIn(app, 'm.quill', nowMs);
  }, 120_000);

  it('reads nothing from the store for whoever is not known', async () => {
    const { world } = desk;
    const blind = createSettleApp({
      world: { ...world, store: {} as Store },
      openBench: () => Promise.reject(new Error('opened')),
      readMessage: () => Promise.reject(new Error('read')),
      waiting: { list: () => Promise.reject(new Error('listed')) },
      ticketKey: key,
      origin,
      base: '',
      onDropped: async () => {},
    });
    const requests: [number, SettleRequest][] = [
      [401, get('/')],
      [401, get('/message?m=x', 'tallypost-settle=a.b')],
      [401, post('/settle', { message: 'x', queue: 'billing', token: 'a.b' })],
      [403, get('/enter?t=a.b')],
      [403, post('/enter', { ticket: 'a.b' })],
      [403, post('/settle', {}, cookie, { origin: 'https://elsewhere.example' })],
    ];
    for (const [status, request] of requests) expect((await blind(request)).status).toBe(status);
  });

  it('lets nobody in without a link, and each link in once', async () => {
    expect((await app(get('/'))).status).toBe(401);
    const ticket = signTicket(key, { purpose: 'enter', by: 'x', untilMs: nowMs + 1, about: 'once' });
    const door = await app(get(`/enter?t=${ticket}`));
    expect([door.status, door.body.includes('as x')]).toEqual([200, true]);
    expect((await app(post('/enter', { ticket }))).status).toBe(303);
    const again = await app(post('/enter', { ticket }));
    expect([again.status, again.body.includes('used before')]).toEqual([403, true]);
    expect((await app(get('/', `${cookie}x`))).status).toBe(401);
    desk.setNow(nowMs + 13 * hourMs);
    expect((await app(get('/', cookie))).status).toBe(401);
    desk.setNow(nowMs);
  });

  it('lists what waits, oldest first, with why', async () => {
    const { body, status } = await app(get('/', cookie));
    expect(status).toBe(200);
    const waiting = await createWaitingList(desk.world).list();
    expect(waiting.length).toBeGreaterThan(5);
    expect(
      [...body.matchAll(/<li><a href="\/message\?m=([^"]+)"/g)].map((match) =>
        decodeURIComponent(match[1] as string),
      ),
    ).toEqual(waiting.map((each) => each.message));
    expect(body).toContain('Not sure enough');
  });

  it('settles nothing without a post of its own with its own token', async () => {
    const [first, second] = await createWaitingList(desk.world).list();
    const page = await app(get(`/message?m=${encodeURIComponent(first!.message)}`, cookie));
    const token = field(page.body, '/settle', 'token');
    const form = { message: first!.message, queue: 'billing', token };
    const attempts: [number, SettleRequest][] = [
      [403, post('/settle', form, cookie, {})],
      [403, post('/settle', form, cookie, { origin: 'https://elsewhere.example' })],
      [403, post('/settle', form, cookie, { origin: 'null' })],
      [403, post('/settle', form, cookie, { origin, 'sec-fetch-site': 'cross-site' })],
      [403, post('/settle', { ...form, token: '' }, cookie)],
      [403, post('/settle', { ...form, token: `${token}A` }, cookie)],
      [403, post('/settle', { ...form, message: second!.message }, cookie)],
      [
        403,
        post(
          '/settle',
          {
            ...form,
            token: signTicket(key, {
              purpose: 'act',
              by: 'other',
              untilMs: nowMs + hourMs,
              about: `1 settle ${first!.message}`,
            }),
          },
          cookie,
        ),
      ],
      [400, post('/settle', { ...form, queue: 'no-such-queue' }, cookie)],
      [401, post('/settle', form)],
      [404, get(`/settle?message=${first!.message}&queue=billing&token=${token}`, cookie)],
    ];
    for (const [i, [status, request]] of attempts.entries())
      expect((await app(request)).status, `attempt ${i}`).toBe(status);
    expect(await heldOf(desk.store, 'm.quill')).toBeNull();
    expect(dropped).toEqual([]);
  });

  it('settles, shows what that teaches, takes it back, settles again, and drops it with the next one', async () => {
    const [first, second, third] = await createWaitingList(desk.world).list();
    const open = (message: string) => app(get(`/message?m=${encodeURIComponent(message)}`, cookie));
    const sent: SettleRequest[] = [];
    const settle = async (message: string, queue: string) => {
      const token = field((await open(message)).body, '/settle', 'token');
      sent.push(post('/settle', { message, queue, token }, cookie));
      return app(sent.at(-1) as SettleRequest);
    };
    const done = await settle(first!.message, 'complaints');
    expect(done.headers.location).toBe(`/message?m=${encodeURIComponent(second!.message)}`);
    const next = await open(second!.message);
    const [, before, after] =
      /was thought (?:under |over )?(\d+)\s% likely for it; with this one counted it would be <strong>(?:over )?(\d+)\s%/.exec(
        next.body,
      ) ?? [];
    expect(Number(after)).toBeGreaterThan(Number(before));
    expect((await open(first!.message)).status).toBe(404);

    const undoForm = { message: first!.message, token: field(next.body, '/undo', 'token') };
    expect((await app(post('/undo', undoForm, cookie))).headers.location).toBe(
      `/message?m=${encodeURIComponent(first!.message)}`,
    );
    expect((await app(post('/undo', undoForm, cookie))).status).toBe(409);
    expect((await open(first!.message)).status).toBe(200);
    expect(dropped).toEqual([]);

    // The very request that settled it, sent again now that it waits again: its token is used up.
    expect((await app(sent[0] as SettleRequest)).status).toBe(403);
    expect(await heldOf(desk.store, 'm.quill')).toBeNull();

    const again = await open(first!.message);
    const replayed = {
      message: first!.message,
      queue: 'billing',
      token: field(again.body, '/settle', 'token'),
    };
    await app(post('/settle', replayed, cookie));
    expect((await app(post('/settle', replayed, cookie))).status).toBe(409);
    await settle(second!.message, 'billing');
    expect(dropped).toHaveLength(1);
    expect((await open(third!.message)).status).toBe(200);
    await finishSettling(desk.store, 'm.quill', async (drop) => void dropped.push(drop));

    const summary = await desk.runner.run();
    expect([summary.confirmed, summary.refused, summary.failed]).toEqual([2, 0, 0]);
    const bench = await desk.openBench();
    const counted = await recount(desk.world, await desk.deps.loadDesk(), bench.extractor.schema);
    expect(counted.differences).toEqual([]);
    expect(counted.messages).toBe(242);
    const left = (await createWaitingList(desk.world).list()).map((each) => each.message);
    expect(left).not.toContain(first!.message);
    expect(left).not.toContain(second!.message);
  });

  it('shows hostile mail as text and names what cannot be seen', async () => {
    const hostile = [
      'From: "<img src=x onerror=alert(1)>" <a@b.example>',
      'To: contact@fenmarkwater.example',
      'Subject: </title><script>document.title="owned"</script>',
      'MIME-Version: 1.0',
      'Content-Type: text/plain; charset=utf-8',
      '',
      '<script>fetch("http://evil.example/")</script> <style>*{display:none}</style> pay \u202e001\u202c now',
      `${'x'.repeat(1_000_000)}`,
    ].join('\r\n');
    const id = 'mail/hostile"><script>1</script>';
    await desk.store.put(keys.inbound + id, Buffer.from(hostile), {
      contentType: 'message/rfc822',
      metadata: {
        'tallypost-decision': 'held',
        'tallypost-reason': 'unsure',
        'tallypost-at': '2026-01-01T00:00:00.000Z',
      },
    });
    const page = await app(get(`/message?m=${encodeURIComponent(id)}`, cookie));
    expect(page.status).toBe(200);
    expect(page.body.match(/<script/g)).toHaveLength(1);
    expect(page.body.match(/<style/g)).toHaveLength(1);
    expect(page.body).not.toMatch(/<img/);
    expect(page.body).not.toContain('\u202e');
    expect(page.body).toContain('&lt;script&gt;fetch(');
    expect(page.body.length).toBeLessThan(400_000);
    expect(page.headers['content-security-policy']).toMatch(
      /^default-src 'none'; style-src 'sha256-[^']+'; script-src 'sha256-/,
    );
    expect((await app(get('/', cookie))).body.match(/<script/g)).toHaveLength(1);
  });
});
