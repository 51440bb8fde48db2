import { describe, expect, it } from 'vitest';
import { TallypostError } from '../../src/errors.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { foldClaims } from '../../src/ledger/fold.ts';
import { recount } from '../../src/ledger/recount.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import {
  claim,
  countingStore,
  countsNow,
  desk,
  fold,
  schema,
  standings,
  startWeek,
  testWorld,
} from './fixture.ts';

const kinds = (outcomes: readonly { kind: string }[]) => outcomes.map((o) => o.kind);

describe('a fold', () => {
  it('puts a confirmed message into the counts of its queue and week', async () => {
    const world = testWorld();
    expect(await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'))).toEqual([
      { kind: 'folded' },
      { kind: 'folded' },
    ]);
    const counts = await countsNow(world);
    expect(counts.columns).toEqual([
      { queue: 'billing', epoch: startWeek },
      { queue: 'leaks', epoch: startWeek },
    ]);
    expect([...counts.messages]).toEqual([1, 1]);
    // Each message has two tokens.
    expect([...counts.regions[0].total]).toEqual([2, 2]);
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing', m2: 'leaks' });
  });

  it('counts a repeated delivery once', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    const { version } = await recount(world, desk, schema);
    expect(kinds(await fold(world, claim('m1', 'billing'), claim('m1', 'billing')))).toEqual([
      'already',
      'already',
    ]);
    expect(await standings(world, ['m1'])).toEqual({ m1: 'billing' });
    expect((await recount(world, desk, schema)).version).toBe(version);
  });

  it('moves a corrected message, and only it', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'), claim('m2', 'billing'));
    expect(kinds(await fold(world, claim('m1', 'leaks', 5)))).toEqual(['folded']);
    expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'leaks', m2: 'billing' });
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('lets the newest confirmation stand, whatever the order of delivery', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'leaks', 5));
    expect(kinds(await fold(world, claim('m1', 'billing', 1)))).toEqual(['stale']);
    expect(kinds(await fold(world, claim('m1', 'billing', 1)))).toEqual(['already']);
    expect(await standings(world, ['m1'])).toEqual({ m1: 'leaks' });
  });

  it('settles several confirmations of one message within a batch', async () => {
    const world = testWorld();
    const outcomes = await fold(
      world,
      claim('m1', 'billing', 1),
      claim('m1', 'leaks', 2),
      claim('m1', 'meters', 0),
      claim('m1', 'leaks', 2),
    );
    expect(kinds(outcomes)).toEqual(['folded', 'folded', 'stale', 'folded']);
    expect(await standings(world, ['m1'])).toEqual({ m1: 'leaks' });
    expect((await countsNow(world)).messages[0]).toBe(1);
  });

  it('refuses an unknown queue and an impossible time, and folds the rest', async () => {
    const world = testWorld();
    const outcomes = await fold(
      world,
      claim('m1', 'nowhere'),
      claim('m2', 'billing', 3 * 24 * 60),
      claim('m3', 'leaks'),
    );
    expect(kinds(outcomes)).toEqual(['refused', 'refused', 'folded']);
    expect(outcomes[0]).toMatchObject({ fault: { code: 'queue-unknown', got: 'nowhere' } });
    expect(outcomes[1]).toMatchObject({ fault: { code: 'confirmation-time-refused' } });
    expect(await standings(world, ['m1', 'm2', 'm3'])).toEqual({ m3: 'leaks' });
  });

  it('refuses a message whose history no store could hold', async () => {
    const world = testWorld();
    const [tooLong, control] = ['x'.repeat(1024), 'a\u0000b'];
    const outcomes = await fold(
      world,
      claim(tooLong, 'billing'),
      claim(control, 'billing'),
      claim('m1', 'billing'),
    );
    expect(kinds(outcomes)).toEqual(['refused', 'refused', 'folded']);
    expect(outcomes[0]).toMatchObject({ fault: { code: 'key-refused' } });
  });

  it('writes once for each message and twice for the batch: 1,000 confirmations, 1,002 writes', async () => {
    const counted = countingStore(createMemoryStore());
    const world = testWorld(1, counted.store);
    const claims = Array.from({ length: 1000 }, (_, i) => claim(`m${i}`, i % 2 ? 'billing' : 'leaks'));
    expect(new Set(kinds(await fold(world, ...claims)))).toEqual(new Set(['folded']));
    expect(counted.calls.put).toBe(1002);
    expect(counted.calls.list ?? 0).toBe(0);
    expect(counted.calls.delete ?? 0).toBe(0);
    expect([...(await countsNow(world)).messages]).toEqual([500, 500]);
  });

  it('reads the list of absorbed segments only for messages that were confirmed before', async () => {
    const counted = countingStore(createMemoryStore());
    const world = testWorld(1, counted.store);
    await fold(world, claim('m1', 'billing'));
    await compact(world, desk, schema);
    for (const name of Object.keys(counted.calls)) delete counted.calls[name];
    await fold(world, claim('m2', 'billing'));
    // The manifest, the history, the manifest again before it is replaced.
    expect(counted.calls).toEqual({ get: 3, put: 3 });
    await fold(world, claim('m1', 'leaks', 5));
    expect(counted.calls).toEqual({ get: 7, put: 6 });
  });

  it('leaves a damaged history alone, names it, and folds the rest', async () => {
    const world = testWorld();
    await world.store.put('histories/m1.json', Buffer.from('{"format":1,"rev":3}'));
    const outcomes = await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
    expect(outcomes[0]).toMatchObject({
      kind: 'retry',
      fault: { code: 'object-damaged', place: 'histories/m1.json' },
    });
    expect(outcomes[1]).toEqual({ kind: 'folded' });
  });

  it('says which object is damaged when the manifest is', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    await world.store.put('model/manifest.json', Buffer.from('{"format":1,"version":-1}'));
    expect(await fold(world, claim('m2', 'billing'))).toMatchObject([
      { kind: 'retry', fault: { code: 'object-damaged', place: 'model/manifest.json#/version' } },
    ]);
  });

  describe.each(['histories/m2', 'model/segments/', 'model/manifest.json'])(
    'while %s cannot be written',
    (prefix) => {
      /** Every put of a key that starts with `prefix` fails so. */
      const failing = (inner: Store, failure: () => Error) => {
        const counted = countingStore(inner);
        const put: Store['put'] = async (key, body, options) => {
          if (key.startsWith(prefix)) throw failure();
          return counted.store.put(key, body, options);
        };
        return { store: { ...counted.store, put }, calls: counted.calls };
      };

      it('names a full disk at once, and folds the same claims once there is room', async () => {
        const inner = createMemoryStore();
        const full = () =>
          new TallypostError({
            code: 'store-full',
            place: 'a key',
            expected: 'space on the disk',
            got: 'ENOSPC',
          });
        const { store, calls } = failing(inner, full);
        const world = testWorld(1, inner);
        const before = world.clock.ms;
        const claims = [claim('m1', 'billing'), claim('m2', 'leaks')];
        expect(await fold({ ...world, store }, ...claims)).toMatchObject([
          { kind: 'retry', fault: { code: 'store-full', place: 'a key', got: 'ENOSPC' } },
          { kind: 'retry', fault: { code: 'store-full', place: 'a key', got: 'ENOSPC' } },
        ]);
        // One round without a pause: the manifest twice at most and two histories.
        expect(calls.get).toBeLessThanOrEqual(4);
        expect(world.clock.ms - before).toBeLessThan(20);
        expect(await standings(world, ['m1', 'm2'])).toEqual({});
        world.clock.ms += 60_000;
        expect(kinds(await fold(world, ...claims))).toEqual(['folded', 'folded']);
        expect(await standings(world, ['m1', 'm2'])).toEqual({ m1: 'billing', m2: 'leaks' });
      });

      it('names a store that does not answer, after all attempts', async () => {
        const { store } = failing(createMemoryStore(), () => new Error('socket hang up'));
        const outcomes = await fold({ ...testWorld(), store }, claim('m1', 'billing'), claim('m2', 'leaks'));
        expect(outcomes).toMatchObject([
          { kind: 'retry', fault: { code: 'store-failed' } },
          { kind: 'retry', fault: { code: 'store-failed' } },
        ]);
      });
    },
  );

  it('does not mix schemas: claims of another one are kept for later', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    const other = { ...schema, id: '00000000000000b2' };
    const features = { ...claim('m2', 'billing').features, schema: other.id };
    const outcomes = await foldClaims(world, desk, other, [{ ...claim('m2', 'billing'), features }]);
    expect(outcomes).toMatchObject([{ kind: 'retry', fault: { code: 'schema-mismatch' } }]);
  });

  it('keeps the record of what was said exact through corrections', async () => {
    const world = testWorld();
    const said = { queue: 'billing', posterior: 0.9, isAudit: false };
    await fold(world, claim('m1', 'billing', 0, 'ann', said));
    const hit = [...(await countsNow(world)).record];
    await fold(world, claim('m1', 'leaks', 1));
    const miss = [...(await countsNow(world)).record];
    // One statement in one band: first a hit, then a miss; never both.
    expect(hit.reduce((a, b) => a + b)).toBe(1);
    expect(miss.reduce((a, b) => a + b)).toBe(1);
    expect(hit.indexOf(1) + 1).toBe(miss.indexOf(1));
    await compact(world, desk, schema);
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });
});
