import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { eraseMessages } from '../../src/ledger/erase.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { mergeQueues } from '../../src/ledger/queues.ts';
import { recount } from '../../src/ledger/recount.ts';
import { restoreVersion } from '../../src/ledger/restore.ts';
import { claim, desk, fold, keysOf, schema, standings, testWorld } from './fixture.ts';

type TestWorld = ReturnType<typeof testWorld>;
const messages = ['m1', 'm2', 'm3', 'm4'];
const restore = (world: TestWorld, version: number, options = {}) =>
  restoreVersion(world, desk, schema, version, options);
const version = async (world: TestWorld) => (await loadModel(world, desk, schema, null)).version;

/** Versions 1 to 5: m1, m2; then m1 corrected; compacted; m3; m2 corrected. */
async function history(): Promise<TestWorld> {
  const world = testWorld();
  await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
  await fold(world, claim('m1', 'meters', 1));
  await compact(world, desk, schema);
  await fold(world, claim('m3', 'billing', 2));
  await fold(world, claim('m2', 'moving', 3));
  expect(await version(world)).toBe(5);
  return world;
}

const states: Record<number, Record<string, string>> = {
  0: {},
  1: { m1: 'billing', m2: 'leaks' },
  2: { m1: 'meters', m2: 'leaks' },
  3: { m1: 'meters', m2: 'leaks' },
  4: { m1: 'meters', m2: 'leaks', m3: 'billing' },
  5: { m1: 'meters', m2: 'moving', m3: 'billing' },
};

describe('a restore', () => {
  it.each([0, 1, 2, 3, 4])(
    'returns to version %i, between compactions and before them, and the recount agrees',
    async (to) => {
      const world = await history();
      expect(await restore(world, to)).toMatchObject({ kind: 'restored', to });
      expect(await standings(world, messages)).toEqual(states[to]);
      expect((await recount(world, desk, schema)).differences).toEqual([]);
      await compact(world, desk, schema);
      expect(await standings(world, messages)).toEqual(states[to]);
      expect((await recount(world, desk, schema)).differences).toEqual([]);
    },
  );

  it('is kept by repeated deliveries of what it took back, and followed by new confirmations', async () => {
    const world = await history();
    await restore(world, 1);
    expect(await fold(world, claim('m1', 'meters', 1), claim('m3', 'billing', 2))).toEqual([
      { kind: 'already' },
      { kind: 'already' },
    ]);
    expect(await standings(world, messages)).toEqual(states[1]);
    expect(await fold(world, claim('m3', 'leaks', 9), claim('m1', 'moving', 9))).toEqual([
      { kind: 'folded' },
      { kind: 'folded' },
    ]);
    expect(await standings(world, messages)).toEqual({ m1: 'moving', m2: 'leaks', m3: 'leaks' });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('may be followed by another, forward only where nothing was taken back', async () => {
    const world = await history();
    await restore(world, 4);
    await expect(restore(world, 5)).rejects.toMatchObject({ code: 'version-unknown' });
    expect(await restore(world, 2)).toMatchObject({ kind: 'restored' });
    expect(await standings(world, messages)).toEqual(states[2]);
  });

  it('changes nothing in a dry run', async () => {
    const world = await history();
    const before = await keysOf(world.store);
    expect(await restore(world, 1, { dryRun: true })).toMatchObject({
      kind: 'dry-run',
      version: 5,
      segments: 3,
    });
    expect(await keysOf(world.store)).toEqual(before);
  });

  it('keeps the queues as they are named now', async () => {
    const world = await history();
    await mergeQueues(world, desk, schema, { from: 'leaks', into: 'billing' });
    await restore(world, 3);
    const { scorer, desk: now } = await loadModel(world, desk, schema, null);
    expect(now.queues.map((q) => q.id)).toEqual(['billing', 'meters', 'moving']);
    // m2 was under leaks, which is billing now; m1 under meters.
    expect([...scorer.messages]).toEqual([1, 1, 0]);
  });

  it.each([-1, 6, 1.5])('refuses version %d, which never was', async (to) => {
    await expect(restore(await history(), to)).rejects.toMatchObject({ code: 'version-unknown' });
  });

  it('refuses what lies before an erasure, whose objects hold what was erased', async () => {
    const world = await history();
    await eraseMessages(world, schema, ['m3']);
    await expect(restore(world, 4)).rejects.toMatchObject({ code: 'version-unknown' });
    await compact(world, desk, schema);
    await expect(restore(world, 4)).rejects.toMatchObject({ code: 'version-unknown' });
  });

  it('refuses what lies past the horizon', async () => {
    const world = await history();
    await compact(world, desk, schema);
    world.clock.ms += bounds.horizonMs + 60_000;
    await compact(world, desk, schema);
    expect(await keysOf(world.store, 'model/versions/')).toEqual([]);
    await expect(restore(world, 4)).rejects.toMatchObject({ code: 'version-unknown' });
    expect(await standings(world, messages)).toEqual(states[5]);
  });
});
