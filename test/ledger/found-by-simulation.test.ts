import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { deleteUnnamed } from '../../src/ledger/deletion.ts';
import { eraseMessages } from '../../src/ledger/erase.ts';
import { recount } from '../../src/ledger/recount.ts';
import { restoreVersion } from '../../src/ledger/restore.ts';
import { undoConfirmations } from '../../src/ledger/undo.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { claim, desk, dieAt, fold, keysOf, schema, standings, testWorld, tokenOf } from './fixture.ts';
import { tokensIn } from './tokens-in.ts';

/** Runs `act` once, just before the first put of a key that starts so. */
function before(inner: Store, prefix: string, act: () => Promise<void>): Store {
  let isFirst = true;
  return {
    ...inner,
    async put(key, body, options) {
      if (key.startsWith(prefix) && isFirst) {
        isFirst = false;
        await act();
      }
      return inner.put(key, body, options);
    },
  };
}

const dayMs = 24 * 3600_000;

describe('what the simulation found once stays mended:', () => {
  it('a compaction that slept through the horizon does not name a base that is deleted', async () => {
    const inner = createMemoryStore();
    const [world, other] = [testWorld(1, inner), testWorld(2, inner)];
    await fold(world, claim('m1', 'billing'));
    const store = before(inner, 'model/versions/', async () => {
      other.clock.ms += bounds.horizonMs + 2 * dayMs;
      await inner.put(
        'model/segments/0mm8eww00-000000000000',
        Buffer.from('an orphan, so that there is something to delete'),
      );
      await compact(other, desk, schema, { dryRun: true });
      await deleteUnnamed(other);
    });
    expect(await compact({ ...world, store }, desk, schema)).toMatchObject({ kind: 'lost-race' });
    expect(await standings(world, ['m1'])).toEqual({ m1: 'billing' });
    expect(await recount(world, desk, schema)).toMatchObject({ fault: null, differences: [] });
  });

  it('a restore lists a segment again though it is older than the floor', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    world.clock.ms += 10 * dayMs;
    await compact(world, desk, schema);
    await fold(world, claim('m2', 'leaks', 60));
    await world.store.put(
      'model/segments/0mm8eww00-000000000000',
      Buffer.from('an orphan, so that the floor rises'),
    );
    world.clock.ms += 6 * dayMs;
    await compact(world, desk, schema);
    expect(await restoreVersion(world, desk, schema, 1)).toMatchObject({ kind: 'restored' });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing' });
    await compact(world, desk, schema);
    expect(await recount(world, desk, schema)).toMatchObject({ fault: null, differences: [] });
  });

  it('an erasure that another process brings to its end cannot be taken back by a restore', async () => {
    const inner = createMemoryStore();
    const world = testWorld(1, inner);
    await fold(world, claim('m1', 'billing'));
    await dieAt(inner, 'model/segments/', (store) => eraseMessages({ ...world, store }, schema, ['m1']));
    world.clock.ms += 60_000;
    expect(await fold(world, claim('m1', 'leaks', 5))).toMatchObject([
      { kind: 'refused', fault: { code: 'message-erased' } },
    ]);
    expect(await standings(world, ['m1'])).toEqual({});
    await expect(restoreVersion(world, desk, schema, 1)).rejects.toMatchObject({ code: 'version-unknown' });
  });

  it('a restore while an undone message is being erased does not leave it in the counts for good', async () => {
    const inner = createMemoryStore();
    const world = testWorld(1, inner);
    await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
    await undoConfirmations(world, schema, { by: 'ann', sinceMs: 0, untilMs: world.clock.ms });
    await dieAt(inner, 'model/segments/', (store) => eraseMessages({ ...world, store }, schema, ['m1']));
    await restoreVersion(world, desk, schema, 1);
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing', m2: 'leaks' });
    world.clock.ms += 60_000;
    expect(await compact(world, desk, schema)).toMatchObject({ orders: 1 });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m2: 'leaks' });
    await expect(restoreVersion(world, desk, schema, 1)).rejects.toMatchObject({ code: 'version-unknown' });
    expect(await recount(world, desk, schema)).toMatchObject({ fault: null, differences: [] });
  });

  it('a compaction within the very millisecond of an erasure leaves none of its segments', async () => {
    const inner = createMemoryStore();
    const still = { ...testWorld(1, inner), nowMs: () => Date.UTC(2026, 2, 2) };
    await fold(still, claim('m1', 'billing'), claim('m2', 'leaks'));
    await compact(still, desk, schema);
    await eraseMessages(still, schema, ['m1']);
    await compact(still, desk, schema);
    for (const key of await keysOf(inner)) {
      const got = await inner.get(key);
      if (got.kind === 'found') expect(tokensIn(key, got.object.body)).not.toContain(tokenOf('m1'));
    }
    expect((await keysOf(inner, 'model/bases/')).length).toBe(1);
  });

  it('a deletion keeps what landed and was absorbed while it looked around', async () => {
    const inner = createMemoryStore();
    const [world, other] = [testWorld(1, inner), testWorld(2, inner)];
    await fold(world, claim('m1', 'billing'));
    const steps = new Map([
      ['get model/manifest.json', async () => void (await fold(other, claim('m2', 'leaks')))],
      [
        'list model/versions/',
        async () => {
          other.clock.ms += bounds.horizonMs + dayMs;
        },
      ],
      ['list model/bases/', async () => void (await compact(other, desk, schema))],
    ]);
    const once = async (name: string) => {
      const step = steps.get(name);
      steps.delete(name);
      await step?.();
    };
    const store: Store = {
      ...inner,
      async get(key, options) {
        const got = await inner.get(key, options);
        await once(`get ${key}`);
        return got;
      },
      async *list(prefix, options) {
        if (prefix !== 'model/versions/') await once(`list ${prefix}`);
        yield* inner.list(prefix, options);
        if (prefix === 'model/versions/') await once(`list ${prefix}`);
      },
    };
    world.clock.ms += bounds.horizonMs + dayMs;
    await deleteUnnamed({ ...world, store });
    expect(steps.size).toBe(0);
    expect(await restoreVersion(world, desk, schema, 2)).toMatchObject({ kind: 'restored' });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing', m2: 'leaks' });
  });

  it('an order whose writing arrives once more after it was carried out is not carried out again', async () => {
    const inner = createMemoryStore();
    const world = testWorld(1, inner);
    const late: (() => Promise<unknown>)[] = [];
    const store: Store = {
      ...inner,
      put(key, body, options) {
        if (key.startsWith('model/orders/')) late.push(() => inner.put(key, body, options));
        return inner.put(key, body, options);
      },
    };
    await fold(world, claim('m1', 'billing'), claim('m2', 'leaks', 0, 'bob'));
    await undoConfirmations({ ...world, store }, schema, { by: 'ann', sinceMs: 0, untilMs: world.clock.ms });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m2: 'leaks' });
    // What ann says since, of the same period, is no part of what was undone.
    await fold(world, claim('m1', 'meters'));
    for (const arrive of late) await arrive();
    world.clock.ms += 3_600_000;
    expect(await compact(world, desk, schema)).toMatchObject({ orders: 0, ordersLeft: 0 });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'meters', m2: 'leaks' });
  });

  it('a recount whose base is deleted meanwhile starts again with the new one', async () => {
    const inner = createMemoryStore();
    const world = testWorld(1, inner);
    await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
    await compact(world, desk, schema);
    let isFirst = true;
    const store: Store = {
      ...inner,
      async get(key, options) {
        if (key.startsWith('model/bases/') && isFirst) {
          isFirst = false;
          await fold(world, claim('m3', 'billing', 5));
          await compact(world, desk, schema);
          world.clock.ms += bounds.horizonMs + dayMs;
          await compact(world, desk, schema);
        }
        return inner.get(key, options);
      },
    };
    expect(await recount({ ...world, store }, desk, schema)).toMatchObject({
      fault: null,
      differences: [],
      messages: 3,
    });
  });

  it('a fold that read nothing of a message long ago sees that a compaction took it in since', async () => {
    const inner = createMemoryStore();
    const [world, other] = [testWorld(1, inner), testWorld(2, inner)];
    let isFirst = true;
    const store: Store = {
      ...inner,
      async get(key, options) {
        // m1 is read before, and has no history yet; m2 after, and stands in a segment beside the base.
        if (key === 'histories/m2.json' && isFirst) {
          isFirst = false;
          await fold(other, claim('m1', 'billing'));
          await compact(other, desk, schema);
          await inner.put('model/segments/0mm8eww00-000000000000', Buffer.from('an orphan: the floor rises'));
          other.clock.ms += bounds.horizonMs + 2 * dayMs;
          await compact(other, desk, schema);
          await fold(other, claim('m2', 'billing'));
          other.clock.ms += 3_600_000;
          world.clock.ms = other.clock.ms;
        }
        return inner.get(key, options);
      },
    };
    await fold({ ...world, store }, claim('m1', 'leaks', 1), claim('m2', 'leaks', 1));
    expect(isFirst).toBe(false);
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'leaks', m2: 'leaks' });
    expect(await recount(world, desk, schema)).toMatchObject({ fault: null, differences: [] });
  });

  it('a restore brings back a confirmation that was taken back when it was outranked', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'leaks', 5, 'bob'), claim('m2', 'leaks', 0, 'bob'));
    await fold(world, claim('m1', 'billing', 1, 'ann'));
    const scope = { sinceMs: 0, untilMs: world.clock.ms + dayMs };
    expect(await undoConfirmations(world, schema, { by: 'ann', ...scope })).toMatchObject({
      confirmations: 1,
    });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'leaks', m2: 'leaks' });
    expect(await restoreVersion(world, desk, schema, 1)).toMatchObject({ kind: 'restored' });
    await undoConfirmations(world, schema, { by: 'bob', ...scope });
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing' });
    expect(await recount(world, desk, schema)).toMatchObject({ fault: null, differences: [] });
  });
});
