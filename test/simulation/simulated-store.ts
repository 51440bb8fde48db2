import { createHash } from 'node:crypto';
import type { GetResult, ObjectHead, PutOptions, PutResult, Store } from '../../src/store/store.ts';
import type { Process, Scheduler } from './scheduler.ts';

interface Held {
  readonly body: Uint8Array;
  /** Of equal bytes always equal, as with S3: nothing may rest on an ETag that was never seen before. */
  readonly etag: string;
  readonly modifiedAtMs: number;
  readonly metadata: Readonly<Record<string, string>>;
}

/** The objects themselves. Every method acts at once. */
export class Objects {
  readonly held = new Map<string, Held>();
  writes = 0;
  onWrite: (key: string) => void = () => {};
  onDelete: (key: string) => void = () => {};
  readonly #nowMs: () => number;

  constructor(nowMs: () => number) {
    this.#nowMs = nowMs;
  }

  put(key: string, body: Uint8Array, options: PutOptions = {}): PutResult {
    const old = this.held.get(key);
    if (options.ifNoneMatch === '*' && old) return { kind: 'lost' };
    if (options.ifMatch !== undefined && old?.etag !== options.ifMatch) return { kind: 'lost' };
    const etag = createHash('md5').update(body).digest('base64');
    this.held.set(key, {
      body: body.slice(),
      etag,
      modifiedAtMs: this.#nowMs(),
      metadata: options.metadata ?? {},
    });
    this.writes += 1;
    this.onWrite(key);
    return { kind: 'written', etag };
  }

  delete(key: string): void {
    if (this.held.delete(key)) this.onDelete(key);
  }

  get(key: string, ifNoneMatch?: string): GetResult {
    const found = this.held.get(key);
    if (!found) return { kind: 'missing' };
    if (found.etag === ifNoneMatch) return { kind: 'not-modified' };
    return { kind: 'found', object: { ...this.head(key), body: found.body } as never };
  }

  head(key: string): ObjectHead | null {
    const found = this.held.get(key);
    if (!found) return null;
    const { etag, modifiedAtMs, metadata, body } = found;
    return { key, etag, bytes: body.length, modifiedAtMs, contentType: 'application/octet-stream', metadata };
  }

  keys(prefix: string): string[] {
    return [...this.held.keys()].filter((key) => key.startsWith(prefix)).sort();
  }
}

/** Lists come in pages, and other processes act between two of them. */
const pageKeys = 3;

/** The store as one process sees it: every call waits for its turn, and may be hit by a fault. */
export function storeOf(objects: Objects, scheduler: Scheduler, process: Process): Store {
  const read = <T>(label: string, effect: () => T) => scheduler.call(process, label, false, null, effect);
  return {
    place: 'simulation',
    get: (key, options = {}) => read(`get ${key}`, () => objects.get(key, options.ifNoneMatch)),
    stream: () => Promise.reject(new Error('not simulated')),
    head: (key) => read(`head ${key}`, () => objects.head(key)),
    put(key, body, options = {}) {
      const isConditional = options.ifMatch !== undefined || options.ifNoneMatch !== undefined;
      const lost: PutResult = { kind: 'lost' };
      const bytes = body.slice();
      return scheduler.call<PutResult>(process, `put ${key}`, true, isConditional ? lost : null, () =>
        objects.put(key, bytes, options),
      );
    },
    async *list(prefix, options = {}) {
      let after = options.after ?? '';
      for (;;) {
        const page = await read(`list ${prefix} after ${after}`, () =>
          objects
            .keys(prefix)
            .filter((key) => key > after)
            .slice(0, pageKeys)
            .map((key) => objects.head(key) as ObjectHead),
        );
        yield* page;
        if (page.length < pageKeys) return;
        after = (page.at(-1) as ObjectHead).key;
      }
    },
    async delete(key) {
      await scheduler.call(process, `delete ${key}`, true, null, () => objects.delete(key));
    },
    replaceMetadata: () => Promise.reject(new Error('not simulated')),
  };
}
