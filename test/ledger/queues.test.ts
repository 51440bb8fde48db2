import { describe, expect, it } from 'vitest';
import type { Desk } from '../../src/desk/desk.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { foldClaims } from '../../src/ledger/fold.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { currentDesk } from '../../src/ledger/queue-names.ts';
import { mergeQueues, openQueue, renameQueue, renamesAfter, retireQueue } from '../../src/ledger/queues.ts';
import { recount } from '../../src/ledger/recount.ts';
import { diffCounts } from '../../src/model/difference.ts';
import { claim, countsNow, desk, fold, keysOf, schema, standings, testWorld } from './fixture.ts';

type TestWorld = ReturnType<typeof testWorld>;

async function deskWorld(): Promise<TestWorld> {
  const world = testWorld();
  const file = {
    ...desk,
    guards: [{ id: 'g', queue: 'leaks', phrases: ['burst'], senders: [], fields: [] }],
    note: 'kept as it is',
  };
  await world.store.put('config/desk.json', Buffer.from(JSON.stringify(file)));
  await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'), claim('m3', 'leaks'));
  await compact(world, desk, schema);
  await fold(world, claim('m4', 'leaks', 3));
  return world;
}

async function deskFile(world: TestWorld): Promise<Desk & { note: string }> {
  const got = await world.store.get('config/desk.json');
  if (got.kind !== 'found') throw new Error('no desk');
  return JSON.parse(Buffer.from(got.object.body).toString());
}

async function totals(world: TestWorld, of: Desk): Promise<Record<string, number>> {
  const { scorer } = await loadModel(world, of, schema, null);
  return Object.fromEntries(scorer.queues.map((queue, k) => [queue, scorer.messages[k]]));
}

describe('a queue', () => {
  it('that is renamed keeps its counts, before and after the desk file is read again', async () => {
    const world = await deskWorld();
    expect(
      await renameQueue(world, desk, schema, { from: 'leaks', to: 'bursts', title: 'Bursts' }),
    ).toMatchObject({
      kind: 'changed',
      messages: 3,
      deskFile: 'updated',
    });
    const expected = { billing: 1, bursts: 3, meters: 0, moving: 0 };
    expect(await totals(world, desk)).toEqual(expected);
    const file = await deskFile(world);
    expect(file.queues[1]).toMatchObject({ id: 'bursts', title: 'Bursts' });
    expect(file.guards[0].queue).toBe('bursts');
    expect(file.note).toBe('kept as it is');
    expect(await totals(world, file)).toEqual(expected);
    // A helpdesk that still says the old name is understood; histories keep what was said.
    await fold(world, claim('m5', 'leaks', 9));
    expect(await foldClaims(world, file, schema, [claim('m6', 'bursts', 9)])).toEqual([{ kind: 'folded' }]);
    expect(await totals(world, desk)).toEqual({ ...expected, bursts: 5 });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('that is merged adds its column exactly, corrections included', async () => {
    const world = await deskWorld();
    await mergeQueues(world, desk, schema, { from: 'leaks', into: 'billing' });
    expect(await totals(world, desk)).toEqual({ billing: 4, meters: 0, moving: 0 });
    expect((await deskFile(world)).queues.map((q) => q.id)).toEqual(['billing', 'meters', 'moving']);
    await fold(world, claim('m2', 'meters', 10), claim('m1', 'leaks', 10));
    expect(await totals(world, desk)).toEqual({ billing: 3, meters: 1, moving: 0 });
    await compact(world, desk, schema);
    expect(await totals(world, desk)).toEqual({ billing: 3, meters: 1, moving: 0 });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('that is retired gives its counts to its successor, and takes them back when it is opened again', async () => {
    const world = await deskWorld();
    await retireQueue(world, desk, schema, { queue: 'leaks', successor: 'meters' });
    expect(await totals(world, await deskFile(world))).toEqual({ billing: 1, meters: 3, moving: 0 });
    expect(await openQueue(world, desk, schema, { queue: 'leaks', title: 'Leaks' })).toMatchObject({
      kind: 'changed',
      messages: 3,
    });
    expect(await totals(world, await deskFile(world))).toEqual({
      billing: 1,
      meters: 0,
      moving: 0,
      leaks: 3,
    });
  });

  it('that is new starts without counts', async () => {
    const world = await deskWorld();
    await openQueue(world, desk, schema, { queue: 'sewers', title: 'Sewers', wrongRouteMinutes: 30 });
    expect((await deskFile(world)).queues.at(-1)).toEqual({
      id: 'sewers',
      title: 'Sewers',
      wrongRouteMinutes: 30,
    });
    expect((await totals(world, await deskFile(world))).sewers).toBe(0);
  });

  it('is split by opening another and confirming messages for it again; the rest stays', async () => {
    const [world, never] = [await deskWorld(), testWorld(2)];
    await openQueue(world, desk, schema, { queue: 'bursts', title: 'Bursts' });
    const file = await deskFile(world);
    const moved = [claim('m2', 'bursts', 60), claim('m4', 'bursts', 60)];
    expect(await foldClaims(world, file, schema, moved)).toEqual([{ kind: 'folded' }, { kind: 'folded' }]);
    expect(await totals(world, file)).toEqual({ billing: 1, leaks: 1, meters: 0, moving: 0, bursts: 2 });
    // As if they had never been in the other half.
    await foldClaims(never, file, schema, [claim('m1', 'billing'), claim('m3', 'leaks'), ...moved]);
    const [split, fresh] = [await countsNow(world), await countsNow(never)];
    expect(diffCounts(split, fresh, 10)).toEqual([]);
    expect((await recount(world, file, schema)).differences).toEqual([]);
  });

  it('is not changed by a dry run, which tells how many messages would move', async () => {
    const world = await deskWorld();
    const before = await keysOf(world.store);
    expect(
      await mergeQueues(world, desk, schema, { from: 'leaks', into: 'billing' }, { dryRun: true }),
    ).toMatchObject({
      kind: 'dry-run',
      messages: 3,
    });
    expect(await keysOf(world.store)).toEqual(before);
    expect((await deskFile(world)).queues.length).toBe(4);
  });

  it('may be changed twice over; the second time there is nothing to do', async () => {
    const world = await deskWorld();
    await renameQueue(world, desk, schema, { from: 'leaks', to: 'bursts' });
    expect(await renameQueue(world, desk, schema, { from: 'leaks', to: 'bursts' })).toMatchObject({
      kind: 'nothing-to-do',
    });
  });

  it('can be renamed before anything was confirmed', async () => {
    const world = testWorld();
    expect(await renameQueue(world, desk, schema, { from: 'leaks', to: 'bursts' })).toMatchObject({
      kind: 'changed',
      deskFile: 'missing',
    });
    await fold(world, claim('m1', 'leaks'));
    expect(await totals(world, desk)).toEqual({ billing: 0, bursts: 1, meters: 0, moving: 0 });
    expect(await standings(world, ['m1'])).toEqual({ m1: 'leaks' });
  });
});

describe('a change of queues is refused', () => {
  const merged = {
    leaks: { to: 'billing', kind: 'merged' },
    old: { to: 'meters', kind: 'renamed' },
  } as const;
  it.each([
    ['an unknown queue', { kind: 'merge', from: 'nowhere', into: 'billing' }],
    ['an unknown successor', { kind: 'retire', queue: 'billing', successor: 'nowhere' }],
    ['itself', { kind: 'merge', from: 'billing', into: 'billing' }],
    ['a queue that is gone already', { kind: 'merge', from: 'leaks', into: 'meters' }],
    ['a name in use', { kind: 'rename', from: 'billing', to: 'meters' }],
    ['a name that another queue had', { kind: 'rename', from: 'billing', to: 'leaks' }],
    ['a name that is none', { kind: 'rename', from: 'billing', to: 'Billing & Co' }],
    ['to open under the old name of a renamed queue', { kind: 'open', queue: 'old', title: 'Old' }],
  ] as const)('for %s', (_, change) => {
    expect(() => renamesAfter(desk, merged, change)).toThrow(
      expect.objectContaining({ code: 'queue-refused' }),
    );
  });

  it('but a renamed queue may get its old name back', () => {
    const renames = renamesAfter(
      desk,
      { meters: { to: 'gauges', kind: 'renamed' } },
      { kind: 'rename', from: 'gauges', to: 'meters' },
    );
    expect(renames).toEqual({ gauges: { to: 'meters', kind: 'renamed' } });
    expect(currentDesk(desk, renames).queues.map((q) => q.id)).toEqual([
      'billing',
      'leaks',
      'meters',
      'moving',
    ]);
  });
});
