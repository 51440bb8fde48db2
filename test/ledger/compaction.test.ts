import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { recount } from '../../src/ledger/recount.ts';
import { undoConfirmations } from '../../src/ledger/undo.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { claim, countsNow, desk, fold, keysOf, schema, standings, testWorld } from './fixture.ts';

describe('a compaction', () => {
  it('absorbs the segments without changing a cell', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
    await fold(world, claim('m1', 'leaks', 1));
    const before = await countsNow(world);
    expect(await compact(world, desk, schema)).toMatchObject({
      kind: 'compacted',
      version: 3,
      messages: 2,
      segments: 2,
    });
    expect(await countsNow(world)).toEqual(before);
    expect(await compact(world, desk, schema)).toMatchObject({ kind: 'nothing-new', version: 3 });
  });

  it('leaves a segment that lands meanwhile where it is', async () => {
    const inner = createMemoryStore();
    const world = testWorld(1, inner);
    await fold(world, claim('m1', 'billing'));
    let isFirst = true;
    const store: Store = {
      ...inner,
      async put(key, body, options) {
        if (key.startsWith('model/bases/') && isFirst) {
          isFirst = false;
          await fold(testWorld(2, inner), claim('m2', 'leaks'));
        }
        return inner.put(key, body, options);
      },
    };
    expect(await compact({ ...world, store }, desk, schema)).toMatchObject({
      kind: 'compacted',
      segments: 1,
    });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing', m2: 'leaks' });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('gives way when another one was quicker, and takes its own objects away', async () => {
    const inner = createMemoryStore();
    const world = testWorld(1, inner);
    await fold(world, claim('m1', 'billing'));
    let isFirst = true;
    const store: Store = {
      ...inner,
      async put(key, body, options) {
        if (key.startsWith('model/absorbed/') && isFirst) {
          isFirst = false;
          await compact(testWorld(2, inner), desk, schema);
        }
        return inner.put(key, body, options);
      },
    };
    expect(await compact({ ...world, store }, desk, schema)).toMatchObject({ kind: 'lost-race' });
    expect((await keysOf(inner, 'model/bases/')).length).toBe(1);
    expect(await standings(world, ['m1'])).toEqual({ m1: 'billing' });
  });

  it('deletes what it superseded only behind the horizon, and what nothing ever named', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    await world.store.put('model/segments/0mm8eww00-000000000000', Buffer.from('of a process that died'));
    await compact(world, desk, schema);
    await fold(world, claim('m2', 'billing'));
    await compact(world, desk, schema);
    expect((await keysOf(world.store, 'model/segments/')).length).toBe(3);
    expect((await keysOf(world.store, 'model/bases/')).length).toBe(2);
    world.clock.ms += bounds.horizonMs - 3600_000;
    expect(await compact(world, desk, schema)).toMatchObject({ deletedObjects: 0 });
    world.clock.ms += 2 * 3600_000;
    // Three segments, the first base with its table and list, two archived versions.
    expect(await compact(world, desk, schema)).toMatchObject({ deletedObjects: 8 });
    expect(await keysOf(world.store, 'model/segments/')).toEqual([]);
    expect((await keysOf(world.store, 'model/bases/')).length).toBe(1);
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing', m2: 'billing' });
    expect(await fold(world, claim('m1', 'leaks', 9))).toEqual([{ kind: 'folded' }]);
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('gives the same base for the same confirmations in any order and any batches', async () => {
    const claims = [
      claim('m1', 'billing', 0),
      claim('m2', 'leaks', 1),
      claim('m1', 'meters', 2),
      claim('m3', 'moving', 3),
      claim('m2', 'billing', 0),
    ];
    const bases: string[] = [];
    for (const order of [
      [0, 1, 2, 3, 4],
      [4, 3, 2, 1, 0],
      [2, 4, 0, 3, 1],
    ]) {
      const world = testWorld(order[0] + 1);
      await fold(world, ...order.slice(0, 2).map((i) => claims[i]));
      if (order[0] === 4) await compact(world, desk, schema);
      for (const i of order.slice(2)) await fold(world, claims[i]);
      await compact(world, desk, schema);
      const got = await world.store.get((await keysOf(world.store, 'model/bases/')).at(-1) as string);
      bases.push(got.kind === 'found' ? Buffer.from(got.object.body).toString('hex') : '');
    }
    expect(bases[0].length).toBeGreaterThan(100);
    expect(bases[1]).toBe(bases[0]);
    expect(bases[2]).toBe(bases[0]);
  });

  it('changes nothing in a dry run, and measures', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    const before = await keysOf(world.store);
    expect(await compact(world, desk, schema, { dryRun: true })).toMatchObject({
      kind: 'dry-run',
      messages: 1,
      columns: 1,
      cells: 2,
    });
    expect(await keysOf(world.store)).toEqual(before);
  });

  it('stops at a base that is damaged, and names it', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    await compact(world, desk, schema);
    await fold(world, claim('m2', 'billing'));
    const [base] = await keysOf(world.store, 'model/bases/');
    await world.store.put(base, Buffer.from('damaged'));
    await expect(compact(world, desk, schema)).rejects.toMatchObject({ name: 'TallypostError', place: base });
  });
});

describe('the result of a compaction', () => {
  it('lists the confirmations that everything else contradicts, by message', async () => {
    const world = testWorld();
    const alike = (message: string, queue: string, token: number) => {
      const one = claim(message, queue);
      return {
        ...one,
        features: { ...one.features, slots: [2, 2], regions: [Float64Array.of(token, token + 1, token + 2)] },
      };
    };
    const claims = Array.from({ length: 60 }, (_, i) =>
      i % 2 ? alike(`b${i}`, 'billing', 50) : alike(`l${i}`, 'leaks', 90),
    );
    await fold(world, ...claims, alike('odd', 'leaks', 50));
    const { contradictions, tokens, fit } = await compact(world, desk, schema);
    expect(fit?.messages).toBe(61);
    // Three tokens of each of the two kinds of message.
    expect(tokens.counted).toBe(6);
    expect(contradictions.map(({ message, queue, likelier }) => ({ message, queue, likelier }))).toEqual([
      { message: 'odd', queue: 'leaks', likelier: 'billing' },
    ]);
    expect(contradictions[0].probability).toBeLessThan(0.01);
  });

  it('states a burst of alike messages, which count up to a cap for routing and in full in the base', async () => {
    const world = testWorld();
    const alike = (i: number) => {
      const one = claim(`burst${i}`, 'billing', 0, 'helper');
      const tokens = Float64Array.from({ length: 50 }, (_, t) => (t < 49 ? 5000 + t : 9000 + i));
      return { ...one, features: { ...one.features, regions: [tokens] } };
    };
    const others = ['a', 'b', 'c'].map((id) => claim(id, 'leaks'));
    await fold(world, ...others, ...Array.from({ length: 30 }, (_, i) => alike(i)));
    const messagesServed = async () => {
      const { scorer } = await loadModel(world, desk, schema, null);
      return scorer.messages[scorer.queues.indexOf('billing')];
    };
    expect(await messagesServed()).toBe(bounds.burstCountedMax);
    expect(await compact(world, desk, schema)).toMatchObject({
      messages: 33,
      bursts: { groups: 1, uncounted: 10 },
    });
    expect(await messagesServed()).toBe(20);
    // The next night: more of them, none counts.
    await fold(world, alike(31), alike(32));
    expect(await messagesServed()).toBe(20);
    expect((await compact(world, desk, schema)).bursts).toEqual({ groups: 1, uncounted: 12 });
    expect(await messagesServed()).toBe(20);
    expect((await recount(world, desk, schema)).differences).toEqual([]);
    const [from, until] = [0, world.clock.ms + 1e9];
    await undoConfirmations(world, schema, { by: 'helper', sinceMs: from, untilMs: until });
    expect(await messagesServed()).toBe(0);
    expect(await compact(world, desk, schema)).toMatchObject({
      messages: 3,
      bursts: { groups: 0, uncounted: 0 },
    });
    const fresh = testWorld(2);
    await fold(fresh, ...others);
    expect(await countsNow(world)).toEqual(await countsNow(fresh));
  });

  it('says which queue changed its wording lately', async () => {
    const world = testWorld();
    const worded = (message: string, week: number, token: number) => {
      const one = claim(message, 'leaks', -week * 7 * 24 * 60);
      return { ...one, features: { ...one.features, regions: [Float64Array.of(token, token + 1)] } };
    };
    await fold(world, ...Array.from({ length: 40 }, (_, i) => worded(`old${i}`, 10, 50)));
    await fold(world, ...Array.from({ length: 40 }, (_, i) => worded(`new${i}`, 0, 90)));
    const { drift } = await compact(world, desk, schema);
    expect(drift).toMatchObject([
      { queue: 'leaks', region: 'word', earlierMessages: 40, recentMessages: 40 },
    ]);
    expect(drift[0].logFactor).toBeGreaterThan(5);
  });
});
