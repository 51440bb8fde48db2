import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { createCompactHandler } from '../../src/handlers/compact.ts';
import { createConfirmHandler } from '../../src/handlers/confirm.ts';
import type { HandlerDeps } from '../../src/handlers/handler-deps.ts';
import { createRouteHandler } from '../../src/handlers/route.ts';
import { documentsOf, type EmfDocument } from '../../src/metrics/emf.ts';
import type { Measurement } from '../../src/metrics/measurement.ts';
import { keys } from '../../src/store/keys.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { openStation, type Station, teach } from '../handlers/station.ts';

/** A station's handlers that measure; `take` gives the documents of everything since it was last called. */
async function openMeasured(createStore: () => Store = createMemoryStore) {
  const station = await openStation(createStore);
  const measured: Measurement[] = [];
  const deps: HandlerDeps = { ...station.deps, measure: (more) => void measured.push(...more) };
  const take = (): EmfDocument[] => documentsOf(measured.splice(0), 'desk', 0);
  return {
    station,
    take,
    route: createRouteHandler(deps),
    confirm: createConfirmHandler(deps),
    compact: createCompactHandler(deps),
  };
}

const drop = (station: Station, name: string, message: string, secondsAgo = 0) =>
  station.putDrop(name, {
    message,
    queue: 'billing',
    by: 'a.tolland',
    at: new Date(station.world.nowMs() - secondsAgo * 1000).toISOString(),
  });

describe('the handlers measure', () => {
  it('a routed batch: what became of it, bands, queues, and how many segments wait', async () => {
    const { station, route, take } = await openMeasured();
    await teach(station);
    const bill = await station.putMail('bill', 'Wrong bill', 'My water bill is too high, I paid already.');
    await station.feed(route, bill, bill);
    const [whole, ...queues] = take();
    const count = (name: string) => (whole![name] as number) ?? 0;
    // One message in two deliveries: decided once.
    expect(count('Routed') + count('Held')).toBe(1);
    expect(whole).toMatchObject({ Guarded: 0, Failed: 0, SegmentsWaiting: 12 });
    const bands = Object.keys(whole!).filter((name) => name.startsWith('Posterior'));
    expect(bands.map((name) => whole![name])).toEqual([1]);
    expect(queues.map(({ Queue, ToQueue }) => [Queue, ToQueue])).toEqual(
      count('Routed') === 1 ? [['billing', 1]] : [],
    );
  });

  it('what is to be delivered again, also when nothing of the batch could begin', async () => {
    let isDown = false;
    const { station, route, take } = await openMeasured(() => {
      const store = createMemoryStore();
      return {
        ...store,
        stream: async (key) => (isDown ? Promise.reject(new Error('down')) : store.stream(key)),
      };
    });
    const mail = await station.putMail('a', 'Hello', 'bill');
    isDown = true;
    await station.feed(route, mail);
    expect(take()).toMatchObject([{ Failed: 1, Routed: 0, Held: 0 }]);
    isDown = false;
    await station.feed(route, mail);
    expect(take()).toMatchObject([{ Failed: 0, Held: 1 }]);

    const undescribed = await openMeasured();
    await undescribed.station.store.delete(keys.desk);
    await undescribed.station.feed(undescribed.route, 'inbound/x', 'inbound/y');
    expect(take()).toEqual([]);
    expect(undescribed.take()).toMatchObject([{ Failed: 2 }]);
  });

  it('confirmations: folded with the time they waited, refused, and none twice', async () => {
    const { station, confirm, take } = await openMeasured();
    await station.putMail('a', 'Bill', 'my bill');
    await station.putMail('archive/billing/old', 'Bill', 'my old bill');
    const dropped = [
      await drop(station, 'd1', 'a', 90),
      await drop(station, 'd2', 'archive/billing/old', 5 * 365 * 24 * 3600),
      await drop(station, 'd3', 'never-came'),
    ];
    await station.feed(confirm, ...dropped);
    // What was learned from an archive did not wait five years.
    expect(take()).toMatchObject([{ Folded: 2, Refused: 1, FoldLagSeconds: 90, Failed: 0 }]);
    await station.feed(confirm, ...dropped);
    expect(take()).toMatchObject([{ Folded: 0, Refused: 0, Failed: 0 }]);
  });

  it('a compaction and, where the event asks for it, a recount', async () => {
    const { station, compact, take } = await openMeasured();
    await teach(station);
    const { recount } = await compact({});
    expect(recount).toBeNull();
    const [made] = take();
    expect(made).toMatchObject({ Compactions: 1, MessagesCounted: 12, SegmentsWaiting: 0 });
    expect(made!.TableBytes).toBeGreaterThan(100);
    expect(made).not.toHaveProperty('RecountDifferences');
    expect((await compact({ recount: true })).recount).toEqual({ messages: 12, fault: null, differences: 0 });
    expect(take()).toMatchObject([{ Compactions: 1, RecountDifferences: 0 }]);
  });

  it('no recount of more histories than a function has time for, and the log says so', async () => {
    const { station, compact, take } = await openMeasured(() => {
      const store = createMemoryStore();
      const pages = async function* () {
        const one = { key: `${keys.histories}x.json`, etag: 'e', bytes: 1, modifiedAtMs: 0 };
        for (let i = 0; i <= bounds.functionRecountMax; i++) yield one;
      };
      return {
        ...store,
        list: (prefix, options) => (prefix === keys.histories ? pages() : store.list(prefix, options)),
      };
    });
    expect((await compact({ recount: true })).recount).toBeNull();
    expect(take()[0]).not.toHaveProperty('RecountDifferences');
    expect(station.log).toContainEqual({ level: 'warn', event: 'recount-skipped', historiesMax: 400_000 });
  });

  it('a difference that the recount finds, loudly', async () => {
    const { station, compact, take } = await openMeasured();
    await teach(station);
    await station.store.delete(`${keys.histories}lesson-3.json`);
    await compact({ recount: true });
    expect(take()[0]!.RecountDifferences).toBeGreaterThan(0);
    expect(station.log.filter(({ event }) => event === 'recount-differs')).toMatchObject([
      { level: 'error', messages: 11 },
    ]);
  });
});
