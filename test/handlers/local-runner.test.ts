import { getEventListeners } from 'node:events';
import { describe, expect, it } from 'vitest';
import {
  createLocalRunner,
  followWaiting,
  queueEvent,
  type RunProgress,
  runWaiting,
} from '../../src/handlers/local-runner.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { lessons, openStation, type Station } from './station.ts';

const nothing = {
  routed: 0,
  held: 0,
  guarded: 0,
  skipped: 0,
  confirmed: 0,
  refused: 0,
  failed: 0,
  compaction: null,
};

async function putLessons(station: Station): Promise<void> {
  for (const [i, [queue, subject, text]] of lessons.entries()) {
    await station.putMail(`lesson ${i}`, subject, text);
    const at = new Date(station.world.nowMs()).toISOString();
    await station.putDrop(`d${i}`, { message: `lesson ${i}`, queue, by: 'a.tolland', at });
  }
}

describe('the local runner', () => {
  it('routes and folds all that waits, then finds nothing more to do', async () => {
    const station = await openStation();
    await putLessons(station);
    await station.putDrop('bad', 'no JSON');
    const steps: RunProgress[] = [];
    const summary = await runWaiting(station.deps, { onProgress: (progress) => steps.push(progress) });
    expect(summary).toEqual({ ...nothing, held: 12, confirmed: 12, refused: 1 });
    expect(steps).toEqual([
      { step: 'route', done: 12, total: 12 },
      { step: 'confirm', done: 13, total: 13 },
    ]);
    expect(await station.keys('confirmations/')).toEqual([]);
    expect(await runWaiting(station.deps)).toEqual(nothing);
  });

  it('folds a whole round in one segment', async () => {
    const station = await openStation();
    await putLessons(station);
    await runWaiting(station.deps);
    expect(await station.keys('model/segments/')).toHaveLength(1);
  });

  it('compacts when enough segments lie beside the base', async () => {
    const station = await openStation();
    await putLessons(station);
    const summary = await runWaiting(station.deps, { segmentsMax: 1 });
    expect(summary.compaction).toMatchObject({ compaction: { kind: 'compacted', messages: 12 } });
  });

  it('looks at decided messages once, not every round', async () => {
    let heads = 0;
    const station = await openStation((nowMs) => {
      const store = createMemoryStore(nowMs);
      return {
        ...store,
        head: (key) => {
          heads += 1;
          return store.head(key);
        },
      };
    });
    await putLessons(station);
    const runner = createLocalRunner(station.deps);
    await runner.run();
    await runner.run();
    heads = 0;
    expect(await runner.run()).toEqual(nothing);
    expect(heads).toBe(0);
    await station.putMail('lesson 0', 'A new text', 'under an old key');
    expect(await runner.run()).toMatchObject({ routed: 0, held: 1 });
  });

  it('counts what failed and tries it again in the next round', async () => {
    const station = await openStation();
    const body = new TextEncoder().encode('Subject: x\r\n\r\ny');
    await station.store.put('inbound/full', body, { metadata: { note: 'x'.repeat(2040) } });
    expect(await runWaiting(station.deps)).toEqual({ ...nothing, failed: 1 });
    await station.store.put('inbound/full', body);
    expect(await runWaiting(station.deps)).toEqual({ ...nothing, held: 1 });
  });

  it('follows until the signal, over a round that fails', async () => {
    const station = await openStation();
    const control = new AbortController();
    const held: number[] = [];
    let lists = 0;
    const failing = {
      ...station.deps,
      world: {
        ...station.world,
        store: {
          ...station.store,
          list: (...args: Parameters<typeof station.store.list>) => {
            lists += 1;
            if (lists === 3) throw new Error('disk unplugged');
            return station.store.list(...args);
          },
        },
        sleep: async () => {
          await station.putMail(`m${lists}`, 'Hello', 'World');
        },
      },
    };
    await followWaiting(failing, {
      signal: control.signal,
      onRound: (summary) => {
        held.push(summary.held);
        if (held.length === 3) control.abort();
      },
    });
    // Each round lists twice: the second round fails at its first list, and its message waits for the next.
    expect(held).toEqual([0, 2, 1]);
    expect(station.log.find(({ event }) => event === 'round-failed')).toMatchObject({
      level: 'error',
      error: 'Error',
    });
  });

  it('leaves nothing behind on the signal, however many rounds there are, and ends in the middle of a pause', async () => {
    const station = await openStation();
    const control = new AbortController();
    const listeners: number[] = [];
    let rounds = 0;
    const world = {
      ...station.world,
      sleep: (): Promise<void> => {
        listeners.push(getEventListeners(control.signal, 'abort').length);
        if (rounds < 30) return Promise.resolve();
        control.abort();
        return new Promise(() => {});
      },
    };
    await followWaiting(
      { ...station.deps, world },
      {
        signal: control.signal,
        onRound: () => {
          rounds += 1;
        },
      },
    );
    expect(rounds).toBe(30);
    expect(listeners).toEqual(Array.from({ length: 30 }, () => 1));
  });

  it('makes events as S3 and SQS do', () => {
    const event = queueEvent(['inbound/two words+ü.eml'], 'desks/a', Date.UTC(2026, 0, 1), () => 0.5);
    const [record] = event.Records as [{ eventSource: string; body: string }];
    expect(record.eventSource).toBe('aws:sqs');
    const body = JSON.parse(record.body);
    expect(body.Records[0]).toMatchObject({
      eventVersion: '2.1',
      eventName: 'ObjectCreated:Put',
      eventTime: '2026-01-01T00:00:00.000Z',
      s3: { object: { key: 'desks/a/inbound/two+words%2B%C3%BC.eml' } },
    });
  });
});
