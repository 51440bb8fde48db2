import { describe, expect, it } from 'vitest';
import { compact } from '../../src/ledger/compaction.ts';
import { recount } from '../../src/ledger/recount.ts';
import { undoConfirmations } from '../../src/ledger/undo.ts';
import { keys } from '../../src/store/keys.ts';
import { claim, desk, fold, keysOf, schema, standings, startMs, testWorld } from './fixture.ts';

const everything = { by: 'import', sinceMs: 0, untilMs: startMs + 365 * 24 * 3600_000 };
const messages = ['m1', 'm2', 'm3', 'm4'];

async function baseBytes(world: ReturnType<typeof testWorld>): Promise<string> {
  await compact(world, desk, schema);
  const { base } = JSON.parse(await text(world, keys.manifest));
  return text(world, keys.bases + base, 'hex');
}

async function text(
  world: ReturnType<typeof testWorld>,
  key: string,
  encoding: 'utf8' | 'hex' = 'utf8',
): Promise<string> {
  const got = await world.store.get(key);
  if (got.kind !== 'found') throw new Error(`${key} is missing`);
  return Buffer.from(got.object.body).toString(encoding);
}

describe('an undo', () => {
  it('leaves the table, byte for byte, that never saw the confirmations', async () => {
    const [world, never] = [testWorld(1), testWorld(2)];
    const kept = [
      claim('m1', 'billing', 0, 'ann'),
      claim('m2', 'leaks', 1, 'bob'),
      claim('m4', 'moving', 9, 'ann'),
    ];
    const taken = [
      claim('m1', 'leaks', 5, 'import'),
      claim('m2', 'meters', 6, 'import'),
      claim('m3', 'meters', 7, 'import'),
      claim('m4', 'leaks', 8, 'import'),
    ];
    await fold(world, ...kept.slice(0, 2));
    await fold(world, ...taken);
    await compact(world, desk, schema);
    await fold(world, kept[2]);
    expect(await standings(world, messages)).toEqual({
      m1: 'leaks',
      m2: 'meters',
      m3: 'meters',
      m4: 'moving',
    });
    expect(await undoConfirmations(world, schema, everything)).toMatchObject({
      kind: 'undone',
      messages: 4,
      confirmations: 4,
    });
    await fold(never, ...kept);
    expect(await baseBytes(world)).toBe(await baseBytes(never));
    expect(await standings(world, messages)).toEqual({ m1: 'billing', m2: 'leaks', m4: 'moving' });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('does so also for confirmations that were delivered late and outranked', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'leaks', 5, 'import'));
    expect(await fold(world, claim('m1', 'billing', 1, 'ann'))).toEqual([{ kind: 'stale' }]);
    await undoConfirmations(world, schema, everything);
    expect(await standings(world, messages)).toEqual({ m1: 'billing' });
  });

  it('takes only who and when it was asked for; the end of the period is not in it', async () => {
    const world = testWorld();
    await fold(
      world,
      claim('m1', 'leaks', 1, 'import'),
      claim('m2', 'leaks', 2, 'import'),
      claim('m3', 'leaks', 1, 'ann'),
    );
    const scope = { by: 'import', sinceMs: startMs, untilMs: startMs + 2 * 60_000 };
    expect(await undoConfirmations(world, schema, scope)).toMatchObject({ messages: 1, confirmations: 1 });
    expect(await standings(world, messages)).toEqual({ m2: 'leaks', m3: 'leaks' });
  });

  it('is not undone by a repeated delivery, nor by being repeated', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'leaks', 1, 'import'));
    await undoConfirmations(world, schema, everything);
    expect(await fold(world, claim('m1', 'leaks', 1, 'import'))).toEqual([{ kind: 'already' }]);
    expect(await undoConfirmations(world, schema, everything)).toMatchObject({
      messages: 0,
      confirmations: 0,
    });
    expect(await standings(world, messages)).toEqual({});
    expect(await fold(world, claim('m1', 'meters', 2, 'ann'))).toEqual([{ kind: 'folded' }]);
    expect(await standings(world, messages)).toEqual({ m1: 'meters' });
  });

  it('changes nothing in a dry run, and tells what it would do', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'leaks', 1, 'import'), claim('m2', 'leaks', 1, 'ann'));
    const before = await keysOf(world.store);
    expect(await undoConfirmations(world, schema, everything, { dryRun: true })).toMatchObject({
      kind: 'dry-run',
      messages: 1,
      confirmations: 1,
    });
    expect(await keysOf(world.store)).toEqual(before);
    expect(await standings(world, messages)).toEqual({ m1: 'leaks', m2: 'leaks' });
  });

  it('that was begun by a process that died is finished by the next compaction', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'leaks', 1, 'import'));
    const order = `${keys.orders}0mm8eww00-000000000000.json`;
    await world.store.put(order, Buffer.from(JSON.stringify({ kind: 'undo', atMs: startMs, ...everything })));
    world.clock.ms += 60_000;
    expect(await compact(world, desk, schema)).toMatchObject({ orders: 1 });
    expect(await standings(world, messages)).toEqual({});
    expect(await world.store.get(order)).toMatchObject({ kind: 'found', object: { bytes: 0 } });
  });
});
