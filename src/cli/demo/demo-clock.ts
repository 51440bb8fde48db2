import type { World } from '../../ledger/world.ts';
import type { Store } from '../../store/store.ts';

/** A world whose time is set by the demo, and whose chance is the same for the same seed. */
export interface DemoWorld {
  readonly world: World;
  setTime(ms: number): void;
}

export function createDemoWorld(store: Store, seed: number, startMs: number): DemoWorld {
  let nowMs = startMs;
  const random = createRandom(seed);
  return {
    world: {
      store,
      // A millisecond passes with each look, so that ids made one after another differ in time as they would.
      nowMs: () => nowMs++,
      random,
      sleep: async (ms) => {
        nowMs += ms;
      },
    },
    setTime(ms) {
      nowMs = Math.max(nowMs, ms);
    },
  };
}

/** Uniform in [0, 1): mulberry32, public domain, by Tommy Ettinger (from memory). Good enough for a demo's dice. */
export function createRandom(seed: number): () => number {
  let state = seed >>> 0;
  return () => {
    state = (state + 0x6d2b79f5) >>> 0;
    let t = state;
    t = Math.imul(t ^ (t >>> 15), t | 1);
    t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  };
}
