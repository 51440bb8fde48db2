/** A set of pairs of small integers that is emptied in no time. Open addressing with steps of one; never more than half
 *  full, since its owner stops adding at `max`. */
export interface PairSet {
  clear(): void;
  /** True when the pair was not there yet. */
  add(left: number, right: number): boolean;
}

export function createPairSet(max: number): PairSet {
  const size = 2 ** Math.ceil(Math.log2(max * 2));
  // Left, right and the round it was filled in, side by side: one read of memory a pair.
  const places = new Int32Array(size * 4);
  let round = 0;
  return {
    clear() {
      round += 1;
    },
    add(left, right) {
      // Multipliers without a pattern in their bits: the golden ratio and pi.
      let at = (Math.imul(left, 0x9e3779b1) ^ Math.imul(right, 0x3243f6a9)) >>> 0;
      at = ((at ^ (at >>> 15)) & (size - 1)) * 4;
      while (places[at + 2] === round) {
        if (places[at] === left && places[at + 1] === right) return false;
        at = (at + 4) & (size * 4 - 1);
      }
      places[at] = left;
      places[at + 1] = right;
      places[at + 2] = round;
      return true;
    },
  };
}
