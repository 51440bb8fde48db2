/** A set of pairs of small integers that is emptied in no time. Open addressing with steps of one; never more than half
 *  full, since its owner stops adding at `max`. */
export interface PairSet {
  clear(): void;
  /** True when the pair was not there yet. */
  add(left: number, right: number): boolean;
}

export function createPairSet(max: number): PairSet {
  const size = 2 ** Math.ceil(Math.log2(max * 2));
  const lefts = new Int32Array(size);
  const rights = new Int32Array(size);
  const filledIn = new Int32Array(size);
  let round = 0;
  return {
    clear() {
      round += 1;
    },
    add(left, right) {
      // Multipliers without a pattern in their bits: the golden ratio and pi.
      let at = (Math.imul(left, 0x9e3779b1) ^ Math.imul(right, 0x3243f6a9)) >>> 0;
      at = (at ^ (at >>> 15)) & (size - 1);
      while (filledIn[at] === round) {
        if (lefts[at] === left && rights[at] === right) return false;
        at = (at + 1) & (size - 1);
      }
      filledIn[at] = round;
      lefts[at] = left;
      rights[at] = right;
      return true;
    },
  };
}
