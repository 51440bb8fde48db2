import { createDirectoryStore } from '../../src/store/directory.ts';
import type { PutOptions } from '../../src/store/store.ts';

/** A process that writes to a directory store on orders from its parent. */
export interface WriteOrder {
  readonly key: string;
  readonly bytes: number;
  readonly options: PutOptions;
}

const store = createDirectoryStore(process.argv[2] as string);
process.on('message', async ({ key, bytes, options }: WriteOrder) => {
  try {
    process.send?.(await store.put(key, new Uint8Array(bytes).fill(process.pid % 256), options));
  } catch (error) {
    const { name, code, place, got } = error as { name: string; code: string; place: string; got: string };
    process.send?.({ kind: 'threw', name, code, place, got });
  }
});
process.on('disconnect', () => process.exit(0));
