import { beforeAll, describe, expect, it } from 'vitest';
import type { ObjectHead, PutResult, Store } from '../../src/store/store.ts';

export const bytes = (text: string): Uint8Array => new TextEncoder().encode(text);
export const text = (body: Uint8Array): string => new TextDecoder().decode(body);

export async function readAll(chunks: AsyncIterable<Uint8Array>): Promise<Uint8Array> {
  const parts: Uint8Array[] = [];
  for await (const chunk of chunks) parts.push(chunk);
  return new Uint8Array(Buffer.concat(parts));
}

export async function keysOf(store: Store, prefix: string, after?: string): Promise<string[]> {
  const keys: string[] = [];
  for await (const { key } of store.list(prefix, after === undefined ? {} : { after })) keys.push(key);
  return keys;
}

export function etagOf(result: PutResult | { kind: 'missing' }): string {
  if (result.kind !== 'written') throw new Error(`expected a write, got ${result.kind}`);
  return result.etag;
}

async function bodyOf(store: Store, key: string): Promise<string | null> {
  const got = await store.get(key);
  return got.kind === 'found' ? text(got.object.body) : null;
}

/** Keys that a mail client, a form or an attacker may make; every store takes them. */
const strangeKeys = [
  'inbound/plain.eml',
  'inbound/UPPER and lower',
  'inbound/upper and lower',
  'inbound/a+b=c&d?e#f%20g',
  'inbound/<angle@quoted.example>"',
  "inbound/apostrophe's (bracket) [square] {curly} *!",
  'inbound/back\\slash',
  'inbound/ümlaut-日本語-עברית-😀',
  'inbound/deep/er/and/deeper',
  'inbound/deep',
  'inbound/.hidden/..two',
  'inbound/trailing-tilde~',
  'inbound/%2e%2e%2f',
  'inbound/at@/sign@',
  'inbound/ends-with-and&/x',
  `inbound/${'long'.repeat(240)}`,
  `inbound/${'é'.repeat(300)}/${'ü'.repeat(180)}`,
];

/** What every store must do. `make` gives an empty store; several handles on the same objects where `again` is given. */
export function describeContract(
  name: string,
  make: () => Promise<{ store: Store; again?: () => Store }>,
): void {
  describe(`contract of a store: ${name}`, () => {
    let store: Store;
    let again: () => Store;
    let count = 0;
    /** A prefix of its own for each test. */
    const fresh = (): string => `t${++count}/`;

    beforeAll(async () => {
      const made = await make();
      store = made.store;
      again = made.again ?? (() => store);
    });

    it('says where it is', () => {
      expect(store.place.length).toBeGreaterThan(0);
    });

    it('finds nothing where nothing was put', async () => {
      expect(await store.get('t/none')).toEqual({ kind: 'missing' });
      expect(await store.head('t/none')).toBeNull();
      expect(await store.stream('t/none')).toBeNull();
      await store.delete('t/none');
      expect(await store.replaceMetadata('t/none', {}, { ifMatch: '"0"' })).toEqual({ kind: 'missing' });
      expect(await keysOf(store, 't/')).toEqual([]);
    });

    it('gives back body, type and metadata as they were put', async () => {
      const key = `${fresh()}a.json`;
      const before = Date.now();
      const etag = etagOf(
        await store.put(key, bytes('{"a":1}'), {
          contentType: 'application/json',
          metadata: { 'tallypost-queue': 'billing', 'tallypost-note': 'x = y; z "q"' },
        }),
      );
      const got = await again().get(key);
      expect(got.kind).toBe('found');
      const object = got.kind === 'found' ? got.object : null;
      expect(object).toMatchObject({ key, etag, bytes: 7, contentType: 'application/json' });
      expect(object?.metadata).toEqual({ 'tallypost-queue': 'billing', 'tallypost-note': 'x = y; z "q"' });
      expect(object?.body).toBeInstanceOf(Uint8Array);
      expect(text(object?.body as Uint8Array)).toBe('{"a":1}');
      // S3 tells whole seconds.
      expect(object?.modifiedAtMs).toBeGreaterThan(before - 2000);
      expect(object?.modifiedAtMs).toBeLessThan(Date.now() + 2000);
      const { body: _, ...head } = object as NonNullable<typeof object>;
      expect(await store.head(key)).toEqual(head satisfies ObjectHead);
    });

    it('keeps every byte value, and bodies of no bytes', async () => {
      const prefix = fresh();
      const all = Uint8Array.from({ length: 256 * 3 }, (_, i) => i % 256);
      await store.put(`${prefix}all`, all);
      await store.put(`${prefix}none`, new Uint8Array(0));
      const got = await store.get(`${prefix}all`);
      expect(got.kind === 'found' && Buffer.from(got.object.body).equals(Buffer.from(all))).toBe(true);
      expect(await store.get(`${prefix}none`)).toMatchObject({ kind: 'found', object: { bytes: 0 } });
      expect(await bodyOf(store, `${prefix}none`)).toBe('');
    });

    it('derives the content type from the key when none is given', async () => {
      const prefix = fresh();
      for (const [name, type] of [
        ['a.eml', 'message/rfc822'],
        ['a.json', 'application/json'],
        ['a', 'application/octet-stream'],
      ] as const) {
        await store.put(prefix + name, bytes('x'));
        expect((await store.head(prefix + name))?.contentType).toBe(type);
      }
    });

    it('does not see what a caller does to its buffers afterwards', async () => {
      const key = `${fresh()}buffer`;
      const mine = bytes('before');
      await store.put(key, mine);
      mine.fill(0);
      const first = await store.get(key);
      if (first.kind === 'found') first.object.body.fill(0);
      expect(await bodyOf(store, key)).toBe('before');
    });

    it('streams a large body in bounded chunks', async () => {
      const key = `${fresh()}large`;
      const large = new Uint8Array(3_000_000).map((_, i) => (i * 7 + (i >> 8)) % 251);
      await store.put(key, large);
      const streamed = await store.stream(key);
      expect(streamed?.head.bytes).toBe(3_000_000);
      const sizes: number[] = [];
      const parts: Uint8Array[] = [];
      for await (const chunk of streamed?.chunks ?? []) {
        sizes.push(chunk.length);
        parts.push(chunk);
      }
      expect(Math.max(...sizes)).toBeLessThanOrEqual(262_144);
      expect(Buffer.concat(parts).equals(Buffer.from(large))).toBe(true);
    });

    it('lets a reader stop a stream early', async () => {
      const key = `${fresh()}large`;
      await store.put(key, new Uint8Array(2_000_000));
      const streamed = await store.stream(key);
      for await (const chunk of streamed?.chunks ?? []) {
        expect(chunk.length).toBeGreaterThan(0);
        break;
      }
      expect((await store.head(key))?.bytes).toBe(2_000_000);
    });

    it('refuses a body above the bound that the reader names', async () => {
      const key = `${fresh()}bounded`;
      await store.put(key, new Uint8Array(1001));
      await expect(store.get(key, { bytesMax: 1000 })).rejects.toMatchObject({
        name: 'TallypostError',
        code: 'object-too-large',
        place: key,
        expected: 'at most 1000 bytes',
        got: '1001 bytes',
      });
      expect((await store.get(key, { bytesMax: 1001 })).kind).toBe('found');
    });

    it('answers a conditional read with not-modified until the object changes', async () => {
      const key = `${fresh()}a`;
      const first = etagOf(await store.put(key, bytes('1')));
      expect(await again().get(key, { ifNoneMatch: first })).toEqual({ kind: 'not-modified' });
      const second = etagOf(await store.put(key, bytes('2')));
      expect(second).not.toBe(first);
      expect((await again().get(key, { ifNoneMatch: first })).kind).toBe('found');
      expect(await again().get(key, { ifNoneMatch: second })).toEqual({ kind: 'not-modified' });
    });

    it('creates only where there is nothing', async () => {
      const key = `${fresh()}a`;
      expect((await store.put(key, bytes('1'), { ifNoneMatch: '*' })).kind).toBe('written');
      expect(await again().put(key, bytes('2'), { ifNoneMatch: '*' })).toEqual({ kind: 'lost' });
      expect(await bodyOf(store, key)).toBe('1');
    });

    it('replaces only the version that was read', async () => {
      const key = `${fresh()}a`;
      const first = etagOf(await store.put(key, bytes('1')));
      const second = etagOf(await again().put(key, bytes('2'), { ifMatch: first }));
      expect(await store.put(key, bytes('3'), { ifMatch: first })).toEqual({ kind: 'lost' });
      expect(await bodyOf(again(), key)).toBe('2');
      expect((await store.put(key, bytes('3'), { ifMatch: second })).kind).toBe('written');
      expect(await bodyOf(again(), key)).toBe('3');
    });

    it('loses a conditional write to an object that is gone, and writes nothing', async () => {
      const key = `${fresh()}a`;
      const first = etagOf(await store.put(key, bytes('1')));
      await store.delete(key);
      expect(await store.put(key, bytes('2'), { ifMatch: first })).toEqual({ kind: 'lost' });
      expect(await store.head(key)).toBeNull();
    });

    it('writes without a condition over anything', async () => {
      const key = `${fresh()}a`;
      for (const body of ['1', '2', '3']) expect((await store.put(key, bytes(body))).kind).toBe('written');
      expect(await bodyOf(store, key)).toBe('3');
    });

    it('deletes on condition only the version that was read', async () => {
      const key = `${fresh()}a`;
      const first = etagOf(await store.put(key, bytes('1')));
      const second = etagOf(await again().put(key, bytes('2')));
      await store.delete(key, { ifMatch: first });
      expect(await bodyOf(again(), key)).toBe('2');
      await store.delete(key, { ifMatch: second });
      expect(await again().head(key)).toBeNull();
      await store.delete(key, { ifMatch: second });
      expect(await keysOf(store, key)).toEqual([]);
    });

    it('lets an object come back after its deletion', async () => {
      const key = `${fresh()}a`;
      const first = etagOf(await store.put(key, bytes('1'), { ifNoneMatch: '*' }));
      await store.delete(key);
      expect(await again().get(key)).toEqual({ kind: 'missing' });
      const second = etagOf(await again().put(key, bytes('1 again'), { ifNoneMatch: '*' }));
      expect(second).not.toBe(first);
      expect(await bodyOf(store, key)).toBe('1 again');
      await store.delete(key);
      await store.delete(key);
      expect(await keysOf(store, key)).toEqual([]);
    });

    it('replaces metadata and keeps body and content type', async () => {
      const key = `${fresh()}a.eml`;
      const first = etagOf(
        await store.put(key, bytes('Subject: x\r\n\r\n'), {
          contentType: 'text/plain',
          metadata: { old: '1' },
        }),
      );
      const second = etagOf(await again().replaceMetadata(key, { new: '2' }, { ifMatch: first }));
      expect(await store.head(key)).toMatchObject({ etag: second, bytes: 14, contentType: 'text/plain' });
      expect((await store.head(key))?.metadata).toEqual({ new: '2' });
      expect(await bodyOf(store, key)).toBe('Subject: x\r\n\r\n');
    });

    it('does not replace the metadata of another body', async () => {
      const key = `${fresh()}a`;
      const first = etagOf(await store.put(key, bytes('1')));
      await store.put(key, bytes('2'), { metadata: { kept: 'yes' } });
      expect(await store.replaceMetadata(key, { kept: 'no' }, { ifMatch: first })).toEqual({ kind: 'lost' });
      expect((await store.head(key))?.metadata).toEqual({ kept: 'yes' });
    });

    it('takes 2,048 bytes of metadata and refuses one more', async () => {
      const key = `${fresh()}a`;
      // 4 letters of the key and 2,044 of the value.
      const etag = etagOf(await store.put(key, bytes('1'), { metadata: { name: 'v'.repeat(2044) } }));
      expect((await store.head(key))?.metadata).toEqual({ name: 'v'.repeat(2044) });
      const tooMuch = { name: 'v'.repeat(2045) };
      const refusal = { code: 'metadata-refused', expected: 'at most 2048 bytes', got: '2049 bytes' };
      await expect(store.put(key, bytes('2'), { metadata: tooMuch })).rejects.toMatchObject(refusal);
      await expect(store.replaceMetadata(key, tooMuch, { ifMatch: etag })).rejects.toMatchObject(refusal);
    });

    it.each([
      ['a capital in its name', { Name: 'x' }],
      ['a space in its name', { 'a b': 'x' }],
      ['an empty name', { '': 'x' }],
      ['a line end', { name: 'a\r\nx-injected: 1' }],
      ['a letter that is not ASCII', { name: 'Zoë' }],
      ['a space at its end', { name: 'a ' }],
      ['a null character', { name: 'a\u0000b' }],
    ])('refuses metadata with %s', async (_, metadata) => {
      const key = `${fresh()}a`;
      await expect(store.put(key, bytes('1'), { metadata })).rejects.toMatchObject({
        code: 'metadata-refused',
      });
      expect(await store.head(key)).toBeNull();
    });

    it.each([
      ['nothing', ''],
      ['1,025 bytes', 'k'.repeat(1025)],
      ['1,026 bytes in 513 letters', 'é'.repeat(513)],
      ['a line feed', 'a\nb'],
      ['half a surrogate pair', 'a\ud800b'],
      ['the parent folder', 'inbound/../../etc/passwd'],
      ['the same folder', './a'],
    ])('refuses a key of %s', async (_, key) => {
      const refusal = { code: 'key-refused' };
      await expect(store.put(key, bytes('1'))).rejects.toMatchObject(refusal);
      await expect(store.get(key)).rejects.toMatchObject(refusal);
      await expect(store.head(key)).rejects.toMatchObject(refusal);
      await expect(store.delete(key)).rejects.toMatchObject(refusal);
    });

    it('takes keys of any characters, each apart from the others', async () => {
      const prefix = fresh();
      for (const key of strangeKeys) await store.put(prefix + key, bytes(key), { ifNoneMatch: '*' });
      for (const key of strangeKeys) expect(await bodyOf(again(), prefix + key)).toBe(key);
      for (const key of strangeKeys) {
        const etag = (await store.head(prefix + key))?.etag as string;
        expect((await store.replaceMetadata(prefix + key, { seen: 'yes' }, { ifMatch: etag })).kind).toBe(
          'written',
        );
      }
      expect((await keysOf(store, prefix)).sort()).toEqual(strangeKeys.map((key) => prefix + key).sort());
      for (const key of strangeKeys) await store.delete(prefix + key);
      expect(await keysOf(store, prefix)).toEqual([]);
    });

    it('lists by prefix in the order of UTF-8 bytes', async () => {
      const prefix = fresh();
      // U+FF5E sorts before U+1F600 by UTF-8 bytes (EF.. < F0..) and after it by UTF-16 units (FF5E > D83D).
      const names = ['a', 'a!', 'a/b', 'a0', 'ab', 'b/c/d', 'Z', 'é', '～', '😀'];
      for (const name of [...names].reverse()) await store.put(`${prefix}in/${name}`, bytes(name));
      await store.put(`${prefix}other`, bytes('x'));
      const expected = ['Z', 'a', 'a!', 'a/b', 'a0', 'ab', 'b/c/d', 'é', '～', '😀'].map(
        (n) => `${prefix}in/${n}`,
      );
      expect(await keysOf(store, `${prefix}in/`)).toEqual(expected);
      expect(await keysOf(store, `${prefix}in/a`)).toEqual(expected.slice(1, 6));
      expect(await keysOf(store, `${prefix}in/b/`)).toEqual([`${prefix}in/b/c/d`]);
      expect(await keysOf(store, `${prefix}in/`, `${prefix}in/a/b`)).toEqual(expected.slice(4));
      expect(await keysOf(store, `${prefix}in/`, `${prefix}in/a/a`)).toEqual(expected.slice(3));
      expect(await keysOf(store, `${prefix}in/`, `${prefix}in/😀`)).toEqual([]);
    });

    it('lists what head says', async () => {
      const prefix = fresh();
      await store.put(`${prefix}a`, bytes('12345'), { metadata: { a: 'b' } });
      const listed = [];
      for await (const item of store.list(prefix)) listed.push(item);
      const head = await store.head(`${prefix}a`);
      expect(listed).toHaveLength(1);
      expect(listed[0]).toMatchObject({ key: `${prefix}a`, etag: head?.etag, bytes: 5 });
      expect(Math.abs((listed[0]?.modifiedAtMs ?? 0) - (head?.modifiedAtMs ?? 0))).toBeLessThan(1000);
    });

    it('lists more than one page, none twice', async () => {
      const prefix = fresh();
      const names = Array.from({ length: 1203 }, (_, i) => `${prefix}${String(i).padStart(5, '0')}`);
      for (let at = 0; at < names.length; at += 50)
        await Promise.all(names.slice(at, at + 50).map((key) => store.put(key, bytes(key))));
      expect(await keysOf(store, prefix)).toEqual(names);
      expect(await keysOf(store, prefix, names[1100])).toEqual(names.slice(1101));
    });

    it('lets one of twenty writers create an object, in every round', async () => {
      const prefix = fresh();
      for (let round = 0; round < 5; round += 1) {
        const results = await Promise.all(
          Array.from({ length: 20 }, (_, i) =>
            again().put(`${prefix}${round}`, bytes(`${i}`), { ifNoneMatch: '*' }),
          ),
        );
        expect(results.filter((result) => result.kind === 'written')).toHaveLength(1);
        const winner = results.findIndex((result) => result.kind === 'written');
        expect(await bodyOf(store, `${prefix}${round}`)).toBe(`${winner}`);
      }
    });

    it('lets one of twenty writers replace a version, in every round', async () => {
      const key = `${fresh()}a`;
      let etag = etagOf(await store.put(key, bytes('start')));
      for (let round = 0; round < 5; round += 1) {
        const results = await Promise.all(
          Array.from({ length: 20 }, (_, i) => again().put(key, bytes(`${round}.${i}`), { ifMatch: etag })),
        );
        expect(results.filter((result) => result.kind === 'written')).toHaveLength(1);
        const winner = results.findIndex((result) => result.kind === 'written');
        expect(await bodyOf(store, key)).toBe(`${round}.${winner}`);
        etag = etagOf(results[winner] as PutResult);
      }
    });

    it('loses no increment of a counter that twenty writers share', async () => {
      const key = `${fresh()}counter`;
      await store.put(key, bytes('0'));
      await Promise.all(
        Array.from({ length: 20 }, async () => {
          for (;;) {
            const got = await again().get(key);
            if (got.kind !== 'found') throw new Error('the counter is gone');
            const next = bytes(String(Number(text(got.object.body)) + 1));
            if ((await again().put(key, next, { ifMatch: got.object.etag })).kind === 'written') return;
          }
        }),
      );
      expect(await bodyOf(store, key)).toBe('20');
    });
  });
}
