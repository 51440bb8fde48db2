import type { World } from '../../../src/ledger/world.ts';
import type { Store } from '../../../src/store/store.ts';

/** The same in every process of a run. */
export const tokenKey: Uint8Array = new Uint8Array(16).fill(21);

export function worldOf(store: Store): World {
  return {
    store,
    nowMs: Date.now,
    random: Math.random,
    sleep: (ms) => new Promise((resolve) => setTimeout(resolve, ms)),
  };
}
