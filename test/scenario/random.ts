/** A seeded source of chance: the same seed gives the same scenario on every machine. */
export interface Chance {
  /** In [0, 1). */
  next(): number;
  /** Whole number in [0, below). */
  below(below: number): number;
  isTrue(probability: number): boolean;
  pick<T>(list: readonly T[]): T;
  /** One key of `weights`, in proportion to its weight. */
  weighted<K extends string>(weights: Readonly<Partial<Record<K, number>>>): K;
  /** Normal with mean 0 and deviation 1. */
  normal(): number;
  /** `count` different members, in random order; all of them when there are fewer. */
  sample<T>(list: readonly T[], count: number): T[];
  hex(digits: number): string;
}

/** Mulberry32 (public domain, Tommy Ettinger): 32 bits of state are plenty for a few thousand letters. */
export function createChance(seed: number): Chance {
  let state = seed >>> 0;
  const next = (): number => {
    state = (state + 0x6d2b79f5) >>> 0;
    let mixed = Math.imul(state ^ (state >>> 15), state | 1);
    mixed = (mixed + Math.imul(mixed ^ (mixed >>> 7), mixed | 61)) ^ mixed;
    return ((mixed ^ (mixed >>> 14)) >>> 0) / 2 ** 32;
  };
  const below = (limit: number): number => Math.floor(next() * limit);
  return {
    next,
    below,
    isTrue: (probability) => next() < probability,
    pick: (list) => list[below(list.length)] as (typeof list)[number],
    weighted(weights) {
      const entries = Object.entries(weights) as [keyof typeof weights & string, number][];
      let left = next() * entries.reduce((sum, [, weight]) => sum + weight, 0);
      for (const [key, weight] of entries) {
        left -= weight;
        if (left < 0) return key as never;
      }
      return (entries.at(-1) as [string, number])[0] as never;
    },
    // Box and Muller (1958); 1 - u keeps the logarithm finite.
    normal: () => Math.sqrt(-2 * Math.log(1 - next())) * Math.cos(2 * Math.PI * next()),
    sample(list, count) {
      const rest = [...list];
      const taken: (typeof rest)[number][] = [];
      while (taken.length < count && rest.length > 0) taken.push(...rest.splice(below(rest.length), 1));
      return taken;
    },
    hex: (digits) => Array.from({ length: digits }, () => below(16).toString(16)).join(''),
  };
}
