import { describe, expect, it } from 'vitest';
import { compact } from '../../src/ledger/compaction.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { claim, countingStore, desk, fold, keysOf, schema, testWorld } from './fixture.ts';

const load = (world: Parameters<typeof loadModel>[0], cached: Parameters<typeof loadModel>[3] = null) =>
  loadModel(world, desk, schema, cached);

describe('the loaded model', () => {
  it('is empty before anything was confirmed, and says so', async () => {
    const model = await load(testWorld());
    expect(model).toMatchObject({ version: 0, isEmpty: true, fault: null });
    expect(model.scorer.queues).toEqual(['billing', 'leaks', 'meters', 'moving']);
  });

  it('holds segments that no compaction absorbed yet, and corrections', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
    await fold(world, claim('m1', 'meters', 1));
    const model = await load(world);
    expect([...model.scorer.messages]).toEqual([0, 1, 1, 0]);
    expect(model).toMatchObject({ version: 2, isEmpty: false });
  });

  it('holds the same after a compaction', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'));
    const before = await load(world);
    await compact(world, desk, schema);
    const after = await load(world, before);
    expect([...after.scorer.messages]).toEqual([...before.scorer.messages]);
    expect(after.version).toBe(before.version + 1);
  });

  it('costs one conditional read when nothing changed, and is the very same', async () => {
    const counted = countingStore(createMemoryStore());
    const world = testWorld(1, counted.store);
    await fold(world, claim('m1', 'billing'));
    await compact(world, desk, schema);
    await fold(world, claim('m2', 'leaks'));
    const model = await load(world);
    for (const name of Object.keys(counted.calls)) delete counted.calls[name];
    expect(await load(world, model)).toBe(model);
    expect(counted.calls).toEqual({ get: 1 });
  });

  it('reads again only what is new: the manifest and one segment', async () => {
    const counted = countingStore(createMemoryStore());
    const world = testWorld(1, counted.store);
    await fold(world, claim('m1', 'billing'));
    await compact(world, desk, schema);
    await fold(world, claim('m2', 'leaks'));
    const model = await load(world);
    await fold(world, claim('m3', 'leaks'));
    for (const name of Object.keys(counted.calls)) delete counted.calls[name];
    expect([...(await load(world, model)).scorer.messages]).toEqual([1, 2, 0, 0]);
    expect(counted.calls).toEqual({ get: 2 });
  });

  it('follows a compaction that deletes what its manifest named while it reads', async () => {
    const inner = createMemoryStore();
    let isFirst = true;
    const store: Store = {
      ...inner,
      async get(key, options) {
        const got = await inner.get(key, options);
        if (key === 'model/manifest.json' && isFirst) {
          isFirst = false;
          await compact(testWorld(2, inner), desk, schema);
          for (const segment of await keysOf(inner, 'model/segments/')) await inner.delete(segment);
        }
        return got;
      },
    };
    await fold(testWorld(1, inner), claim('m1', 'billing'));
    const model = await load(testWorld(3, store));
    expect([...model.scorer.messages]).toEqual([1, 0, 0, 0]);
    expect(model.version).toBe(2);
  });

  it('names the object when the manifest names one that is gone for good', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    const [segment] = await keysOf(world.store, 'model/segments/');
    await world.store.delete(segment);
    await expect(load(world)).rejects.toMatchObject({ code: 'object-missing', place: segment });
  });

  it('refuses a damaged table, segment and manifest, each with its place', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    await compact(world, desk, schema);
    await fold(world, claim('m2', 'billing'));
    const [table] = await keysOf(world.store, 'model/tables/');
    const segment = (await keysOf(world.store, 'model/segments/')).at(-1) as string;
    for (const place of [table, segment]) {
      const got = await world.store.get(place);
      if (got.kind !== 'found') throw new Error(`${place} is missing`);
      const altered = got.object.body.slice();
      altered[altered.length >> 1] ^= 1;
      await world.store.put(place, altered);
      await expect(load(world)).rejects.toMatchObject({ name: 'TallypostError', place });
      await world.store.put(place, got.object.body);
    }
    await world.store.put('model/manifest.json', Buffer.from('not JSON'));
    await expect(load(world)).rejects.toMatchObject({ code: 'object-damaged', place: 'model/manifest.json' });
  });

  it('holds nothing, and says why, when the counts are of another schema', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'));
    const model = await loadModel(world, desk, { ...schema, id: '00000000000000b2' }, await load(world));
    expect(model).toMatchObject({ isEmpty: true, fault: { code: 'schema-mismatch' } });
  });

  it('takes a changed desk without reading anything again', async () => {
    const world = testWorld();
    await fold(world, claim('m1', 'billing'), claim('m2', 'moving'));
    const model = await load(world);
    const smaller = { ...desk, queues: desk.queues.slice(0, 2) };
    const again = await loadModel(world, smaller, schema, model);
    expect(again.scorer.queues).toEqual(['billing', 'leaks']);
    expect([...again.scorer.messages]).toEqual([1, 0]);
  });
});
