import { checkKey, checkMetadata, checkSize, chunksOf, contentTypeOf, isAfter, sortKeys } from './checks.ts';
import type { ObjectHead, PutOptions, PutResult, Store, StoredObject } from './store.ts';

/** A store that lives and dies with the process. Every call acts at once: it is linearizable by construction. */
export function createMemoryStore(nowMs: () => number = Date.now): Store {
  const objects = new Map<string, StoredObject>();
  let writes = 0;

  const place = 'memory';
  const headOf = ({ body: _, ...head }: StoredObject): ObjectHead => head;

  function write(
    key: string,
    body: Uint8Array,
    contentType: string,
    metadata: Record<string, string>,
  ): PutResult {
    writes += 1;
    const etag = `m${writes}`;
    objects.set(key, { key, etag, bytes: body.length, modifiedAtMs: nowMs(), contentType, metadata, body });
    return { kind: 'written', etag };
  }

  return {
    place,
    async get(key, options = {}) {
      checkKey(key);
      const object = objects.get(key);
      if (object === undefined) return { kind: 'missing' };
      if (options.ifNoneMatch === object.etag) return { kind: 'not-modified' };
      checkSize(key, object.bytes, options.bytesMax);
      // A copy: what the caller does to its body must not reach the store.
      return { kind: 'found', object: { ...object, body: object.body.slice() } };
    },
    async stream(key) {
      checkKey(key);
      const object = objects.get(key);
      return object === undefined ? null : { head: headOf(object), chunks: chunksOf(object.body.slice()) };
    },
    async head(key) {
      checkKey(key);
      const object = objects.get(key);
      return object === undefined ? null : headOf(object);
    },
    async put(key: string, body: Uint8Array, options: PutOptions = {}) {
      checkKey(key);
      checkMetadata(key, options.metadata ?? {});
      const old = objects.get(key);
      if (options.ifNoneMatch === '*' && old !== undefined) return { kind: 'lost' };
      if (options.ifMatch !== undefined && old?.etag !== options.ifMatch) return { kind: 'lost' };
      return write(key, body.slice(), options.contentType ?? contentTypeOf(key), { ...options.metadata });
    },
    async *list(prefix, options = {}) {
      const after = options.after;
      const found = [...objects.keys()].filter(
        (key) => key.startsWith(prefix) && (after === undefined || isAfter(key, after)),
      );
      for (const key of sortKeys(found)) {
        const object = objects.get(key);
        if (object === undefined) continue;
        yield { key, etag: object.etag, bytes: object.bytes, modifiedAtMs: object.modifiedAtMs };
      }
    },
    async delete(key, options = {}) {
      checkKey(key);
      if (options.ifMatch !== undefined && objects.get(key)?.etag !== options.ifMatch) return;
      objects.delete(key);
    },
    async replaceMetadata(key, metadata, options) {
      checkKey(key);
      checkMetadata(key, metadata);
      const old = objects.get(key);
      if (old === undefined) return { kind: 'missing' };
      if (old.etag !== options.ifMatch) return { kind: 'lost' };
      return write(key, old.body, old.contentType, { ...metadata });
    },
  };
}
