import { describe, expect, it } from 'vitest';
import { createDeskLoader } from '../../src/handlers/load-desk.ts';
import { loadTokenKey } from '../../src/handlers/load-token-key.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { exampleDesk, exampleKey } from '../features/example.ts';
import { openStation } from './station.ts';

describe('the desk loader', () => {
  it('asks the store once a minute at most, and gives the same object while the file is the same', async () => {
    let gets: (string | undefined)[] = [];
    const station = await openStation((nowMs) => {
      const store = createMemoryStore(nowMs);
      return {
        ...store,
        get: (key, options) => {
          gets.push(options?.ifNoneMatch);
          return store.get(key, options);
        },
      };
    });
    const load = createDeskLoader(station.world);
    const first = await load();
    station.pass(59_999);
    expect(await load()).toBe(first);
    expect(gets).toEqual([undefined]);
    gets = [];
    station.pass(1);
    expect(await load()).toBe(first);
    expect(gets).toEqual([expect.any(String)]);
    await station.putDesk({ ...exampleDesk, name: 'Other' });
    station.pass(60_000);
    expect((await load()).name).toBe('Other');
  });
});

describe('the token key', () => {
  const hex = '000102030405060708090a0b0c0d0e0f';

  it('comes from the setting before anything in the store', async () => {
    const store = createMemoryStore();
    await store.put('config/token-key', new TextEncoder().encode('f'.repeat(32)));
    expect(await loadTokenKey(store, hex, null)).toEqual(exampleKey);
    expect([...(await loadTokenKey(store, '', null))]).toEqual(new Array(16).fill(255));
  });

  it('is made once and kept', async () => {
    const store = createMemoryStore();
    const first = await loadTokenKey(store, undefined, () => exampleKey);
    expect(first).toEqual(exampleKey);
    expect(await loadTokenKey(store, undefined, () => new Uint8Array(16))).toEqual(exampleKey);
    const got = await store.get('config/token-key');
    expect(got.kind === 'found' && new TextDecoder().decode(got.object.body)).toBe(`${hex}\n`);
  });

  it('is refused when there is none, or it is none', async () => {
    const store = createMemoryStore();
    await expect(loadTokenKey(store, undefined, null)).rejects.toMatchObject({
      code: 'token-key-missing',
      place: 'memory/config/token-key',
    });
    await store.put('config/token-key', new TextEncoder().encode('secret'));
    await expect(loadTokenKey(store, undefined, null)).rejects.toMatchObject({
      code: 'token-key-unreadable',
      got: '6 characters',
    });
  });
});
