import { describe, expect, it } from 'vitest';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { PutResult, Store } from '../../src/store/store.ts';
import { exampleDesk } from '../features/example.ts';
import { openStation, type Station, teach } from './station.ts';

const done = { batchItemFailures: [] };
const failed = (...receipts: string[]) => ({
  batchItemFailures: receipts.map((itemIdentifier) => ({ itemIdentifier })),
});
const drop = (message: string, queue = 'billing') => ({
  message,
  queue,
  by: 'a.tolland',
  at: '2026-03-02T09:00:00Z',
});

/** A store that does something else for some calls, as `change` says. */
function altered(change: (store: Store) => Partial<Store>): (nowMs: () => number) => Store {
  return (nowMs) => {
    const store = createMemoryStore(nowMs);
    return { ...store, ...change(store) };
  };
}

describe('messages that are hard to read', () => {
  it.each<[string, Uint8Array, string]>([
    ['nothing at all', new Uint8Array(), 'unreadable'],
    ['random bytes', Uint8Array.from({ length: 3000 }, (_, i) => (i * i * 31 + i) % 256), ''],
    ['a form that is not JSON', new TextEncoder().encode('{"form":'), 'unreadable'],
  ])('%s is held, and the rest of the batch is routed', async (title, body, reason) => {
    const station = await openStation();
    await teach(station);
    const bad = title.includes('form') ? 'inbound/bad.json' : 'inbound/bad';
    await station.store.put(bad, body);
    const good = await station.putMail(
      'good',
      'Wrong bill',
      'My bill is too high, I paid the amount already.',
    );
    expect(await station.feed(station.route, bad, good)).toEqual(done);
    const held = await station.metadata(bad);
    expect(held['tallypost-decision']).toBe('held');
    if (reason !== '') expect(held['tallypost-reason']).toBe(reason);
    expect(await station.metadata(good)).toMatchObject({ 'tallypost-queue': 'billing' });
  });

  it('a message that leaves no room for metadata fails alone and loudly', async () => {
    const station = await openStation();
    const body = new TextEncoder().encode('Subject: x\r\n\r\ny');
    await station.store.put('inbound/full', body, { metadata: { note: 'x'.repeat(2040) } });
    const good = await station.putMail('good', 'Hello', 'World');
    expect(await station.feed(station.route, 'inbound/full', good)).toEqual(failed('inbound/full'));
    expect(station.log.find(({ level }) => level === 'error')).toMatchObject({
      event: 'route-failed',
      code: 'metadata-full',
      place: 'inbound/full',
      message: 'full',
    });
    expect(await station.metadata(good)).toMatchObject({ 'tallypost-decision': 'held' });
  });

  it('a setup notice, a vanished object, archived mail and what is outside of inbound/ are done with', async () => {
    const station = await openStation();
    await station.store.put(
      'inbound/AMAZON_SES_SETUP_NOTIFICATION',
      new TextEncoder().encode('From: x@y.test\r\n\r\nhello'),
    );
    await station.store.put('reports/x.html', new Uint8Array(1));
    const feed = station.feed(
      station.route,
      'inbound/AMAZON_SES_SETUP_NOTIFICATION',
      'inbound/gone',
      'inbound/archive/billing/1',
      'reports/x.html',
    );
    expect(await feed).toEqual(done);
    expect(await station.metadata('inbound/AMAZON_SES_SETUP_NOTIFICATION')).toEqual({});
    expect(await station.metadata('reports/x.html')).toEqual({});
    expect(station.log.map(({ event }) => event).sort()).toEqual([
      'message-missing',
      'object-skipped',
      'object-skipped',
      'object-skipped',
    ]);
  });
});

describe('confirmations that cannot be folded', () => {
  async function refused(station: Station, body: unknown) {
    const key = await station.putDrop('d1', body);
    expect(await station.feed(station.confirm, key)).toEqual(done);
    expect(await station.keys('confirmations/')).toEqual([]);
    expect(await station.keys('model/')).toEqual([]);
    expect(station.log.at(-1)).toMatchObject({ level: 'warn', event: 'confirmation-refused', drop: key });
    return station.json('confirmations-refused/d1.json');
  }

  it('an unknown queue is kept aside with what is wrong', async () => {
    const station = await openStation();
    await station.putMail('m1', 'Hello', 'World');
    expect(await refused(station, drop('m1', 'billling'))).toEqual({
      code: 'queue-unknown',
      place: 'histories/m1.json',
      expected: 'a queue of the desk',
      got: 'billling',
      refusedAt: '2026-03-02T09:00:00.000Z',
      trace: expect.any(String),
      drop: drop('m1', 'billling'),
    });
  });

  it('a message that does not exist', async () => {
    const station = await openStation();
    expect(await refused(station, drop('m2'))).toMatchObject({
      code: 'message-missing',
      place: 'inbound/m2',
      expected: 'the confirmed message',
      got: 'nothing',
      drop: drop('m2'),
    });
  });

  it('an unknown member', async () => {
    const station = await openStation();
    await station.putMail('m1', 'Hello', 'World');
    expect(await refused(station, { ...drop('m1'), que: 'x' })).toMatchObject({
      code: 'confirmation-invalid',
      place: 'confirmations/d1.json',
      expected: 'only message, queue, by and at',
    });
  });

  it('what is no JSON is kept as text', async () => {
    expect(await refused(await openStation(), 'billing!')).toMatchObject({
      code: 'confirmation-invalid',
      drop: 'billing!',
    });
  });

  it('what is far too large is kept by its beginning', async () => {
    const record = (await refused(await openStation(), `"${'x'.repeat(100_000)}"`)) as {
      code: string;
      drop: string;
    };
    expect(record.code).toBe('confirmation-too-large');
    expect(record.drop).toHaveLength(65_536);
  });

  it('a key that leads out of inbound/', async () => {
    expect(await refused(await openStation(), drop('../config/desk.json'))).toMatchObject({
      code: 'key-refused',
    });
  });

  it('a time far ahead', async () => {
    const station = await openStation();
    await station.putMail('m1', 'Hello', 'World');
    expect(await refused(station, { ...drop('m1'), at: '2031-01-01T00:00:00Z' })).toMatchObject({
      code: 'confirmation-time-refused',
    });
  });

  it('stop none of the others of their batch', async () => {
    const station = await openStation();
    await station.putMail('m1', 'Hello', 'World');
    const keys = [
      await station.putDrop('d1', 'no JSON'),
      await station.putDrop('d2', drop('m1')),
      await station.putDrop('d3', drop('m2')),
    ];
    expect(await station.feed(station.confirm, ...keys)).toEqual(done);
    expect(await station.keys('confirmations')).toEqual([
      'confirmations-refused/d1.json',
      'confirmations-refused/d3.json',
    ]);
    expect(await station.keys('histories/')).toEqual(['histories/m1.json']);
  });

  it('a drop that was replaced while it was folded is left to its own event', async () => {
    let replace: (() => Promise<unknown>) | null = null;
    const station = await openStation(
      altered((store) => ({
        async put(key, body, options) {
          const result = await store.put(key, body, options);
          // The last step of a fold: after it only the drop is left to be deleted.
          if (key === 'model/manifest.json' && replace !== null) await replace();
          return result;
        },
      })),
    );
    await station.putMail('m1', 'Hello', 'World');
    const key = await station.putDrop('d1', drop('m1'));
    replace = async () => {
      replace = null;
      await station.putDrop('d1', { ...drop('m1', 'leaks'), at: '2026-03-02T09:00:01Z' });
    };
    expect(await station.feed(station.confirm, key)).toEqual(done);
    expect(await station.json(key)).toMatchObject({ queue: 'leaks' });
    station.pass(5000);
    await station.feed(station.confirm, key);
    expect(await station.keys('confirmations')).toEqual([]);
  });
});

describe('a desk’s file that cannot be used', () => {
  it.each<[string, unknown, Record<string, unknown>]>([
    ['missing', null, { code: 'desk-missing', place: 'memory/config/desk.json' }],
    ['not JSON', '{', { code: 'desk-not-json', place: 'config/desk.json' }],
    [
      'broken',
      { ...exampleDesk, queues: [], costs: {} },
      { code: 'desk-invalid', problems: [{}, {}, {}], place: 'config/desk.json' },
    ],
  ])('%s: every delivery comes again, and works once the file does', async (_title, file, fault) => {
    const station = await openStation(createMemoryStore, null);
    if (file !== null) await station.putDesk(file);
    const key = await station.putMail('m1', 'Hello', 'World');
    const key2 = await station.putMail('m2', 'Hello', 'World');
    expect(await station.feed(station.route, key, key2)).toEqual(failed(key, key2));
    expect(station.log).toMatchObject([{ level: 'error', event: 'batch-failed', objects: 2, ...fault }]);
    await station.putDesk(exampleDesk);
    expect(await station.feed(station.route, key, key2)).toEqual(done);
    expect(await station.metadata(key2)).toMatchObject({ 'tallypost-decision': 'held' });
  });

  it('a direct event has no partial answer: the handler throws, so that it is tried again', async () => {
    const station = await openStation(createMemoryStore, null);
    const event = {
      Records: [
        { eventVersion: '2.1', eventName: 'ObjectCreated:Put', s3: { object: { key: 'inbound/m1' } } },
      ],
    };
    await expect(station.route(event)).rejects.toMatchObject({ code: 'delivery-failed' });
  });

  it('a file that breaks later stops work within a minute, and a mended one is used', async () => {
    const station = await openStation();
    const route = async (name: string) =>
      station.feed(station.route, await station.putMail(name, 'Hello', 'World'));
    expect(await route('m1')).toEqual(done);
    await station.putDesk('{');
    expect(await route('m2')).toEqual(done); // Looked at less than a minute ago.
    station.pass(60_000);
    expect(await route('m3')).toEqual(failed('inbound/m3'));
    await station.putDesk({ ...exampleDesk, guards: [{ id: 'all', queue: 'leaks', phrases: ['world'] }] });
    expect(await route('m4')).toEqual(done);
    expect(await station.metadata('inbound/m4')).toMatchObject({ 'tallypost-reason': 'all' });
  });
});

describe('a model that cannot be used', () => {
  const guarded = { ...exampleDesk, guards: [{ id: 'danger', queue: 'leaks', phrases: ['burst main'] }] };

  async function damage(station: Station, prefix: string): Promise<void> {
    for (const key of await station.keys(prefix)) {
      const got = await station.store.get(key);
      if (got.kind !== 'found') continue;
      const body = got.object.body.slice();
      body[Math.floor(body.length / 2)]! ^= 0x10;
      await station.store.put(key, body);
    }
  }

  it.each([
    ['a damaged table', 'model/tables/', 'bytes-altered'],
    ['a damaged segment', 'model/segments/', 'bytes-altered'],
  ])('%s: guards act, the rest is held, and the fault is named', async (_title, prefix, code) => {
    const station = await openStation(createMemoryStore, guarded);
    await teach(station);
    if (prefix === 'model/tables/') await station.compact({});
    await damage(station, prefix);
    const bill = await station.putMail('bill', 'Wrong bill', 'My bill is too high.');
    const main = await station.putMail('main', 'Help', 'There is a burst main');
    expect(await station.feed(station.route, bill, main)).toEqual(done);
    expect(await station.metadata(bill)).toMatchObject({
      'tallypost-decision': 'held',
      'tallypost-reason': 'model-unusable',
    });
    expect(await station.metadata(main)).toMatchObject({
      'tallypost-decision': 'guarded',
      'tallypost-queue': 'leaks',
    });
    const line = station.log.find(({ event }) => event === 'model-unusable');
    expect(line).toMatchObject({ level: 'error', code });
    expect(String(line!.place)).toContain(prefix);
  });

  it('a damaged manifest: the last good model of this process serves on', async () => {
    const station = await openStation();
    await teach(station);
    await station.feed(station.route, await station.putMail('m1', 'Wrong bill', 'My bill is too high.'));
    await station.store.put('model/manifest.json', new TextEncoder().encode('{"format":1'));
    const key = await station.putMail('m2', 'Wrong bill', 'My bill is too high.');
    expect(await station.feed(station.route, key)).toEqual(done);
    expect(await station.metadata(key)).toMatchObject({
      'tallypost-queue': 'billing',
      'tallypost-model': '12',
    });
    expect(station.log.find(({ event }) => event === 'model-unusable')).toMatchObject({
      code: 'object-damaged',
    });
  });

  it('a model of another schema: everything is held, with the reason', async () => {
    const station = await openStation();
    await teach(station);
    await station.putDesk({ ...exampleDesk, forms: ['contact', 'leak', 'move'] });
    station.pass(60_000);
    const key = await station.putMail('m1', 'Wrong bill', 'My bill is too high.');
    expect(await station.feed(station.route, key)).toEqual(done);
    expect(await station.metadata(key)).toMatchObject({ 'tallypost-reason': 'model-unusable' });
    expect(station.log.find(({ event }) => event === 'model-unusable')).toMatchObject({
      code: 'schema-mismatch',
    });
  });

  it('a desk that counts otherwise than the model: what this process last routed with serves on', async () => {
    const station = await openStation();
    await teach(station);
    await station.feed(station.route, await station.putMail('m1', 'Wrong bill', 'My bill is too high.'));
    await station.putDesk({ ...exampleDesk, forms: ['contact', 'leak', 'move'] });
    station.pass(60_000);
    const key = await station.putMail('m2', 'Wrong bill', 'My bill is too high.');
    expect(await station.feed(station.route, key)).toEqual(done);
    const [before, after] = [await station.metadata('inbound/m1'), await station.metadata(key)];
    expect(after['tallypost-posterior']).toBe(before['tallypost-posterior']);
    expect(after['tallypost-schema']).toBe(before['tallypost-schema']);
    expect(station.log.find(({ event }) => event === 'model-unusable')).toMatchObject({
      level: 'error',
      code: 'schema-mismatch',
    });
  });

  it('a compaction over a damaged base says so and leaves everything as it was', async () => {
    const station = await openStation();
    await teach(station);
    await station.compact({});
    await damage(station, 'model/bases/');
    await station.putMail('m1', 'Wrong bill', 'My bill is too high.');
    await station.confirmAs('m1', 'billing');
    const before = await station.json('model/manifest.json');
    await expect(station.compact({})).rejects.toMatchObject({ code: 'bytes-altered' });
    expect(await station.json('model/manifest.json')).toEqual(before);
    expect(station.log.at(-1)).toMatchObject({
      level: 'error',
      event: 'compaction-failed',
      code: 'bytes-altered',
    });
  });
});

describe('a store that fails', () => {
  /** As Node reports a full disk. */
  const full = (): never => {
    throw Object.assign(new Error('ENOSPC: no space left on device, write'), { code: 'ENOSPC' });
  };

  it('a full disk: nothing is lost, everything comes again, and works once there is room', async () => {
    let isFull = false;
    const station = await openStation(
      altered((store) => ({
        put: async (...args): Promise<PutResult> => (isFull ? full() : store.put(...args)),
        replaceMetadata: async (...args) => (isFull ? full() : store.replaceMetadata(...args)),
      })),
    );
    const key = await station.putMail('m1', 'Hello', 'World');
    const dropped = await station.putDrop('d1', drop('m1'));
    isFull = true;
    expect(await station.feed(station.route, key)).toEqual(failed(key));
    expect(station.log.at(-1)).toMatchObject({
      level: 'error',
      event: 'route-failed',
      error: 'Error ENOSPC',
    });
    expect(await station.feed(station.confirm, dropped)).toEqual(failed(dropped));
    expect(station.log.at(-1)).toMatchObject({
      level: 'warn',
      event: 'confirmation-postponed',
      message: 'm1',
    });
    expect(await station.keys('confirmations')).toEqual([dropped]);
    isFull = false;
    station.pass(3600_000);
    expect(await station.feed(station.route, key)).toEqual(done);
    expect(await station.feed(station.confirm, dropped)).toEqual(done);
    expect(await station.metadata(key)).toMatchObject({ 'tallypost-decision': 'held' });
    expect(await station.keys('confirmations')).toEqual([]);
  });

  it('a body that breaks off is not taken for a whole message', async () => {
    let isBroken = true;
    const station = await openStation(
      altered((store) => ({
        async stream(key) {
          const found = await store.stream(key);
          if (found === null || !isBroken) return found;
          const chunks = (async function* () {
            for await (const chunk of found.chunks) yield chunk.subarray(0, 200);
            throw new Error('socket hang up');
          })();
          return { head: found.head, chunks };
        },
      })),
    );
    const key = await station.putMail('m1', 'Hello', 'World');
    expect(await station.feed(station.route, key)).toEqual(failed(key));
    expect(await station.metadata(key)).toEqual({});
    isBroken = false;
    expect(await station.feed(station.route, key)).toEqual(done);
  });

  it('a message that keeps changing is left for later after three attempts', async () => {
    let tries = 0;
    const station = await openStation(
      altered(() => ({
        replaceMetadata: async () => {
          tries += 1;
          return { kind: 'lost' };
        },
      })),
    );
    const key = await station.putMail('m1', 'Hello', 'World');
    expect(await station.feed(station.route, key)).toEqual(failed(key));
    expect(tries).toBe(3);
    expect(station.log.at(-1)).toMatchObject({ level: 'warn', event: 'object-changing' });
  });

  it('a write whose answer was lost is recognised by the decision that stands', async () => {
    let isFirst = true;
    const station = await openStation(
      altered((store) => ({
        async replaceMetadata(...args) {
          const result = await store.replaceMetadata(...args);
          if (!isFirst) return result;
          isFirst = false;
          return { kind: 'lost' };
        },
      })),
    );
    const key = await station.putMail('m1', 'Hello', 'World');
    expect(await station.feed(station.route, key)).toEqual(done);
    expect(station.log.at(-1)).toMatchObject({ event: 'decided-already' });
    expect(await station.metadata(key)).toMatchObject({ 'tallypost-decision': 'held' });
  });
});

describe('logs', () => {
  it('hold no word of a customer, nor a drop’s odd content', async () => {
    const station = await openStation();
    const canary = 'Zanzibarquince';
    await teach(station);
    const mail = await station.putMail(
      'm1',
      `About ${canary}`,
      `${canary} is my name, bill ${canary}`,
      `X-Note: ${canary}\nContent-Type: text/${canary}; charset=${canary}`,
    );
    const form = await station.putForm('f1', { form: canary, fields: { [canary]: canary } });
    const bad = await station.putForm('f2', `{${canary}`);
    await station.feed(station.route, mail, form, bad);
    await station.confirmAs('m1', 'billing');
    await station.feed(station.confirm, await station.putDrop('d1', { ...drop('m1'), [canary]: canary }));
    await station.compact({});
    expect(station.log.length).toBeGreaterThan(15);
    expect(JSON.stringify(station.log).toLowerCase()).not.toContain(canary.toLowerCase());
    for (const key of [...(await station.keys('model/')), ...(await station.keys('histories/'))]) {
      const got = await station.store.get(key);
      const text = got.kind === 'found' ? Buffer.from(got.object.body).toString('latin1') : '';
      expect(text.toLowerCase()).not.toContain(canary.toLowerCase());
    }
  });
});
