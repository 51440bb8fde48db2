import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import type { Schema } from '../../src/features/schema.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { eraseMessages } from '../../src/ledger/erase.ts';
import { foldClaims } from '../../src/ledger/fold.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { renameQueue } from '../../src/ledger/queues.ts';
import { recount } from '../../src/ledger/recount.ts';
import { restoreVersion } from '../../src/ledger/restore.ts';
import { undoConfirmations } from '../../src/ledger/undo.ts';
import {
  claim,
  desk,
  dieAt,
  featuresOf,
  fold,
  keysOf,
  schema,
  standings,
  startMs,
  testWorld,
} from './fixture.ts';

type TestWorld = ReturnType<typeof testWorld>;
const messages = ['m1', 'm2', 'm3'];

async function counted(): Promise<TestWorld> {
  const world = testWorld();
  await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
  await compact(world, desk, schema);
  await fold(world, claim('m3', 'leaks', 1), claim('m1', 'leaks', 2));
  return world;
}

/** `inner` with `act` before each of its reads and writes. */
function beforeEachCall(inner: TestWorld['store'], act: () => Promise<void>): TestWorld['store'] {
  const { get, put, head } = inner;
  return {
    ...inner,
    get: async (...given) => {
      await act();
      return get(...given);
    },
    put: async (...given) => {
      await act();
      return put(...given);
    },
    head: async (...given) => {
      await act();
      return head(...given);
    },
  };
}

/** Swaps two segments or bases behind the ledger's back. */
async function overwrite(world: TestWorld, key: string, from: string): Promise<void> {
  const got = await world.store.get(from);
  if (got.kind !== 'found') throw new Error(`${from} is missing`);
  await world.store.put(key, got.object.body);
}

describe('a recount', () => {
  it('agrees with base and segments, cell by cell', async () => {
    expect(await recount(await counted(), desk, schema)).toEqual({
      version: 3,
      messages: 3,
      differences: [],
      fault: null,
      unread: 0,
      repair: 'none',
    });
  });

  it('names the cells that differ, and with repair makes them right', async () => {
    const world = await counted();
    // A base that lost m2: one made where only m1 was confirmed.
    const other = testWorld(2);
    await fold(other, claim('m1', 'billing'));
    await compact(other, desk, schema);
    const [foreign] = await keysOf(other.store, 'model/bases/');
    const [base] = await keysOf(world.store, 'model/bases/');
    const got = await other.store.get(foreign);
    if (got.kind === 'found') await world.store.put(base, got.object.body);
    const { differences } = await recount(world, desk, schema);
    // m2's message, two slots, two tokens, and the exposure.
    expect(differences.length).toBeGreaterThanOrEqual(5);
    expect(differences[0]).toMatchObject({ left: 2, right: 3 });
    expect(await recount(world, desk, schema, { repair: true })).toMatchObject({ repair: 'repaired' });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
    expect(await standings(world, messages)).toEqual({ m1: 'leaks', m2: 'leaks', m3: 'leaks' });
    expect(await recount(world, desk, schema, { repair: true })).toMatchObject({ repair: 'not-needed' });
  });

  it('replaces a base that cannot be read', async () => {
    const world = await counted();
    const [base] = await keysOf(world.store, 'model/bases/');
    await world.store.put(base, Buffer.from('damaged'));
    expect((await recount(world, desk, schema)).fault).toMatchObject({ place: base });
    expect(await recount(world, desk, schema, { repair: true })).toMatchObject({ repair: 'repaired' });
    expect(await recount(world, desk, schema)).toMatchObject({ differences: [], fault: null });
    await compact(world, desk, schema);
    expect(await standings(world, messages)).toEqual({ m1: 'leaks', m2: 'leaks', m3: 'leaks' });
  });

  it('finds a segment that was replaced by another', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    await fold(world, claim('m2', 'leaks'));
    const [first, second] = await keysOf(world.store, 'model/segments/');
    await overwrite(world, second, first);
    expect((await recount(world, desk, schema)).differences).not.toEqual([]);
  });

  it.each([
    [
      'a fold',
      (world) => fold(world, claim('m2', 'billing', 40)),
      { m1: 'leaks', m2: 'billing', m3: 'leaks' },
    ],
    ['an erasure', (world) => eraseMessages(world, schema, ['m3']), { m1: 'leaks', m2: 'leaks' }],
    [
      'an undo',
      (world) =>
        undoConfirmations(world, schema, { by: 'ann', sinceMs: startMs + 60_000, untilMs: startMs + 1e9 }),
      { m1: 'billing', m2: 'leaks' },
    ],
    ['a restore', (world) => restoreVersion(world, desk, schema, 1), { m1: 'billing', m2: 'leaks' }],
    [
      'a change of a queue',
      (world) => renameQueue(world, desk, schema, { from: 'leaks', to: 'bursts' }),
      { m1: 'leaks', m2: 'leaks', m3: 'leaks' },
    ],
    [
      'another repair',
      (world) => recount(world, desk, schema, { repair: true }),
      { m1: 'leaks', m2: 'leaks', m3: 'leaks' },
    ],
  ] as [string, (world: TestWorld) => Promise<unknown>, Record<string, string>][])(
    'repairs a lost base though %s comes between any two of its calls',
    async (_, act, stands) => {
      let calls = 0;
      for (let at = 0; at <= calls; at++) {
        const world = await counted();
        const [base] = await keysOf(world.store, 'model/bases/');
        await world.store.put(base, Buffer.from('damaged'));
        calls = 0;
        const store = beforeEachCall(world.store, async () => {
          calls += 1;
          // Where it needs the base, it says that it cannot read it.
          if (calls - 1 === at) await act(world).catch((error) => expect(error.place).toBe(base));
        });
        const { repair } = await recount({ ...world, store }, desk, schema, { repair: true });
        expect(['repaired', 'not-needed'], `at call ${at}`).toContain(repair);
        // What could not be done without a base.
        await act(world);
        expect(await recount(world, desk, schema), `at call ${at}`).toMatchObject({
          fault: null,
          differences: [],
        });
        expect(await standings(world, messages), `at call ${at}`).toEqual(stands);
      }
      expect(calls).toBeGreaterThan(8);
    },
  );

  it('that is disturbed by an erasure in every pass compares nothing and repairs nothing', async () => {
    const world = await counted();
    const doomed = Array.from({ length: 2 * bounds.recountAttemptsMax }, (_, i) => `doomed-${i}`);
    await fold(world, ...doomed.map((message) => claim(message, 'moving', 3)));
    await compact(world, desk, schema);
    const left = [...doomed];
    const store: TestWorld['store'] = {
      ...world.store,
      list: async function* (prefix, options) {
        // Once it has read which version to compare.
        if (prefix === 'histories/') await eraseMessages(world, schema, [left.shift() as string]);
        yield* world.store.list(prefix, options);
      },
    };
    const contended = { fault: { code: 'contended' }, differences: [] };
    expect(await recount({ ...world, store }, desk, schema)).toMatchObject({ ...contended, repair: 'none' });
    expect(left.length).toBe(bounds.recountAttemptsMax);
    expect(await recount({ ...world, store }, desk, schema, { repair: true })).toMatchObject({
      ...contended,
      repair: 'lost-race',
    });
    expect(left).toEqual([]);
    expect(await recount(world, desk, schema)).toMatchObject({ fault: null, differences: [], messages: 3 });
    expect(await standings(world, [...messages, ...doomed])).toEqual({
      m1: 'leaks',
      m2: 'leaks',
      m3: 'leaks',
    });
  });
});

describe('after a change of schema', () => {
  const wider: Schema = {
    ...schema,
    id: '00000000000000b2',
    slots: [...schema.slots, { id: 'new', group: 'facts', values: ['missing', 'other', 'yes'] }],
  };
  const reread = async (message: string) =>
    message === 'm3'
      ? null
      : { ...featuresOf(message), schema: wider.id, slots: [...featuresOf(message).slots, 2] };

  it('a recount reads the messages again and turns the model to the new schema', async () => {
    const world = await counted();
    expect(await recount(world, desk, wider, { repair: true, reread })).toMatchObject({
      repair: 'repaired',
      unread: 1,
      messages: 2,
    });
    const model = await loadModel(world, desk, wider, null);
    expect(model.fault).toBeNull();
    expect([...model.scorer.messages]).toEqual([0, 2, 0, 0]);
    expect(await recount(world, desk, wider)).toMatchObject({ differences: [], fault: null });
  });

  it('corrections and late confirmations go on, also of a message whose raw form was gone', async () => {
    const world = await counted();
    await recount(world, desk, wider, { repair: true, reread });
    const newClaim = (message: string, queue: string, minute: number) => {
      const features = { ...featuresOf(message), schema: wider.id, slots: [...featuresOf(message).slots, 2] };
      return { ...claim(message, queue, minute), features };
    };
    const outcomes = await foldClaims(world, desk, wider, [
      newClaim('m1', 'meters', 20),
      newClaim('m3', 'billing', 20),
    ]);
    expect(outcomes).toEqual([{ kind: 'folded' }, { kind: 'folded' }]);
    expect([...(await loadModel(world, desk, wider, null)).scorer.messages]).toEqual([1, 1, 1, 0]);
    await compact(world, desk, wider);
    expect(await recount(world, desk, wider)).toMatchObject({ differences: [], messages: 3 });
  });

  /** Folds one more message under the old schema just before each of the first `times` bases is put. */
  const busy = (world: TestWorld, times: number) => {
    let folds = 0;
    const put: TestWorld['store']['put'] = async (key, body, options) => {
      if (key.startsWith('model/bases/') && folds < times) {
        folds += 1;
        await fold(world, claim(`late-${folds}`, 'moving', folds));
      }
      return world.store.put(key, body, options);
    };
    return { world: { ...world, store: { ...world.store, put } }, folds: () => folds };
  };

  it('a recount finds its gap between folds, and counts under the new schema what they folded', async () => {
    const world = await counted();
    const occupied = busy(world, 5);
    const slept: number[] = [];
    const sleep = async (ms: number) => void slept.push(ms);
    expect(await recount({ ...occupied.world, sleep }, desk, wider, { repair: true, reread })).toMatchObject({
      repair: 'repaired',
      messages: 7,
      unread: 1,
    });
    expect(occupied.folds()).toBe(5);
    // Before each new attempt, drawn at random.
    expect(slept.length).toBeGreaterThanOrEqual(5);
    expect(new Set(slept).size).toBeGreaterThan(1);
    // m1 and m2 under leaks as before, late-1 to late-5 under moving; m3 could not be read.
    expect([...(await loadModel(world, desk, wider, null)).scorer.messages]).toEqual([0, 2, 0, 5]);
    expect(await recount(world, desk, wider)).toMatchObject({ differences: [], fault: null });
  });

  it('a recount that finds no gap says so, and changes nothing', async () => {
    const world = await counted();
    const occupied = busy(world, Number.POSITIVE_INFINITY);
    expect(await recount(occupied.world, desk, wider, { repair: true, reread })).toMatchObject({
      repair: 'lost-race',
    });
    expect(occupied.folds()).toBe(bounds.recountAttemptsMax);
    expect((await loadModel(world, desk, schema, null)).fault).toBeNull();
    expect(await recount(world, desk, schema)).toMatchObject({ differences: [], fault: null, messages: 11 });
    expect(await standings(world, [...messages, 'late-8'])).toEqual({
      m1: 'leaks',
      m2: 'leaks',
      m3: 'leaks',
      'late-8': 'moving',
    });
  });

  it.each([
    ['ends', null],
    ['dies before its segment is put', 'model/segments/'],
    ['dies before its commit', 'model/manifest.json'],
  ] as const)(
    'a fold under the old schema that %s between any two calls is counted once all the same',
    async (_, deadAt) => {
      const claims = [claim('m1', 'billing', 30), claim('m4', 'moving', 31)];
      const widened = claims.map((c) => ({
        ...c,
        features: { ...c.features, schema: wider.id, slots: [...c.features.slots, 2] },
      }));
      let calls = 0;
      for (let at = 0; at <= calls; at++) {
        const world = await counted();
        calls = 0;
        const strike = async () => {
          calls += 1;
          if (calls - 1 !== at) return;
          if (deadAt === null) await fold(world, ...claims);
          else await dieAt(world.store, deadAt, (store) => fold({ ...world, store }, ...claims));
        };
        const store = beforeEachCall(world.store, strike);
        const repaired = await recount({ ...world, store }, desk, wider, { repair: true, reread });
        expect(repaired.repair, `at call ${at}`).toBe('repaired');
        // Delivered again, by a process that has the new schema.
        world.clock.ms += 3_600_000;
        const outcomes = await foldClaims(world, desk, wider, widened);
        for (const { kind } of outcomes) expect(['folded', 'already'], `at call ${at}`).toContain(kind);
        const { scorer } = await loadModel(world, desk, wider, null);
        // m1 billing, m2 leaks, m4 moving; m3 could not be read.
        expect([...scorer.messages], `at call ${at}`).toEqual([1, 1, 0, 1]);
        expect(await recount(world, desk, wider)).toMatchObject({
          differences: [],
          fault: null,
          messages: 3,
        });
      }
      expect(calls).toBeGreaterThan(15);
    },
  );

  it('everything but that recount refuses to mix the two', async () => {
    const world = await counted();
    await expect(compact(world, desk, wider)).rejects.toMatchObject({ code: 'schema-mismatch' });
    expect((await loadModel(world, desk, wider, null)).fault).toMatchObject({ code: 'schema-mismatch' });
    expect(await recount(world, desk, schema)).toMatchObject({ differences: [] });
  });
});
