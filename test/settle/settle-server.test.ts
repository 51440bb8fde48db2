import { mkdtemp, rm } from 'node:fs/promises';
import { request } from 'node:http';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { serveSettling } from '../../src/cli/commands/settle.ts';
import { openSession } from '../../src/cli/store-session.ts';
import { readHistory } from '../../src/ledger/history-store.ts';
import { createWaitingList } from '../../src/settle/waiting.ts';
import { createDirectoryStore } from '../../src/store/directory.ts';
import { keys } from '../../src/store/keys.ts';
import { playSmallDesk } from './small-desk.ts';

type Served = Awaited<ReturnType<typeof serveSettling>>;

interface Reply {
  readonly status: number;
  readonly headers: Readonly<Record<string, string | string[] | undefined>>;
  readonly body: string;
}

/** Node's own client: unlike fetch it lets a test choose the Host header. */
function ask(
  origin: string,
  method: string,
  path: string,
  headers: Record<string, string> = {},
  body = '',
): Promise<Reply> {
  return new Promise((resolve, reject) => {
    const sent = request(`${origin}${path}`, { method, headers }, (response) => {
      let text = '';
      response.on('data', (chunk) => {
        text += chunk;
      });
      response.on('end', () =>
        resolve({ status: response.statusCode ?? 0, headers: response.headers, body: text }),
      );
    });
    sent.on('error', reject);
    sent.end(body);
  });
}

describe('the local server', () => {
  let folder: string;
  let served: Served;
  let origin: string;
  const post = (path: string, form: Record<string, string>, cookie = '') =>
    ask(
      origin,
      'POST',
      path,
      { origin, cookie, 'content-type': 'application/x-www-form-urlencoded' },
      new URLSearchParams(form).toString(),
    );

  beforeAll(async () => {
    folder = await mkdtemp(join(tmpdir(), 'tallypost-settle-'));
    const store = createDirectoryStore(folder);
    const { messages } = await playSmallDesk(60, 90, 90, store);
    // The command reads the desk's secret from the store or the environment: here the one that the desk was played with.
    await store.put(keys.tokenKey, Buffer.from(`${'05'.repeat(16)}\n`), { contentType: 'text/plain' });
    expect(messages.length).toBe(90);
    served = await serveSettling(await openSession(folder), { port: 0, fold: true });
    origin = served.server.origin;
  }, 240_000);
  afterAll(async () => {
    await served?.server.close();
    await rm(folder, { recursive: true });
  });

  it('listens on this machine alone, and answers to no other name', async () => {
    expect(origin).toMatch(/^http:\/\/127\.0\.0\.1:\d+$/);
    const port = new URL(origin).port;
    expect((await ask(origin, 'GET', '/', { host: `rebound.example:${port}` })).status).toBe(421);
    expect((await ask(origin, 'GET', '/', { host: `localhost:${port}` })).status).toBe(421);
    expect((await ask(origin, 'GET', '/')).status).toBe(401);
  });

  it('reads no more of a request than one needs', async () => {
    expect((await post('/settle', { message: 'x'.repeat(10_000) })).status).toBe(413);
  });

  it('folds a settlement as soon as the next is made, and the last one when it ends', async () => {
    const store = createDirectoryStore(folder);
    const waiting = createWaitingList({ store, nowMs: Date.now, random: Math.random, sleep: async () => {} });
    const [first, second] = await waiting.list();
    const ticket = new URL(served.server.linkFor('s.penhale')).searchParams.get('t') as string;
    const inside = await post('/enter', { ticket });
    const cookie = (inside.headers['set-cookie'] as string[])[0]!.split(';')[0] as string;
    const settle = async (message: string) => {
      const page = await ask(origin, 'GET', `/message?m=${encodeURIComponent(message)}`, { cookie });
      const token =
        /name="token" value="([^"]*)"/.exec(page.body.slice(page.body.indexOf('action="/settle"')))?.[1] ??
        '';
      expect((await post('/settle', { message, queue: 'billing', token }, cookie)).status).toBe(303);
    };
    const world = { store, nowMs: Date.now, random: Math.random, sleep: async () => {} };
    await settle(first!.message);
    expect((await readHistory(world, first!.message)).stored).toBeNull();
    await settle(second!.message);
    expect((await readHistory(world, first!.message)).stored).toMatchObject({
      confirmations: [{ queue: 'billing', by: 's.penhale' }],
    });
    expect((await readHistory(world, second!.message)).stored).toBeNull();
    await served.server.close();
    expect((await readHistory(world, second!.message)).stored).toMatchObject({
      confirmations: [{ queue: 'billing', by: 's.penhale' }],
    });
    expect(served.settled()).toBe(2);
    await expect(ask(origin, 'GET', '/')).rejects.toThrow(/ECONNREFUSED/);
  });
});
