import type { TokensBlock } from './fit.ts';
import type { TokenRatios } from './view.ts';

/** Sums over a message's tokens, before length scaling and exponents; each [queues]. */
export interface ReadingSums {
  /** Σ log p_k/m of present tokens where it is above 0, and where below. */
  readonly for: Float64Array;
  readonly against: Float64Array;
  /** Σ log (1 - p_k)/(1 - m) over the tokens that are absent. */
  readonly absent: Float64Array;
}

export function emptySums(queues: number, value = 0): ReadingSums {
  return {
    for: new Float64Array(queues).fill(value),
    against: new Float64Array(queues).fill(value),
    absent: new Float64Array(queues).fill(value),
  };
}

/** What one present token adds to the sums; it leaves the sum of the absent ones. */
export function sumsOfToken({ present, absent }: TokenRatios): ReadingSums {
  return {
    for: present.map((ratio) => Math.max(0, Math.log(ratio))),
    against: present.map((ratio) => Math.min(0, Math.log(ratio))),
    absent: absent === null ? new Float64Array(present.length) : absent.map((factor) => -Math.log(factor)),
  };
}

/** What a block takes of its reading's sums; [queues]. */
export function partOf(sums: ReadingSums, part: TokensBlock['part']): Float64Array {
  return part === 'all' ? sums.for.map((x, k) => x + sums.against[k] + sums.absent[k]) : sums[part];
}
