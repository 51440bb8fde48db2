import type { ScorerRegion } from '../model/scorer.ts';

/** Messages of each open queue that hold the token of a row; [queues]. */
export function countsOfRow(region: ScorerRegion, row: number, queues: number): Float64Array {
  const { start, column, count } = region.counts;
  const sums = new Float64Array(queues);
  for (let p = start[row]!; p < start[row + 1]!; p += 1) {
    const queue = region.queueOf[column[p]!]!;
    if (queue >= 0) sums[queue]! += count[p]!;
  }
  return sums;
}

/** Token to messages of one queue that hold it; those of other queues are left out. O(cells). */
export function tokensOfQueue(region: ScorerRegion, queue: number): Map<number, number> {
  const { tokens, start, column, count } = region.counts;
  const found = new Map<number, number>();
  tokens.forEach((token, row) => {
    let sum = 0;
    for (let p = start[row]!; p < start[row + 1]!; p += 1) {
      if (region.queueOf[column[p]!] === queue) sum += count[p]!;
    }
    if (sum > 0) found.set(token, sum);
  });
  return found;
}
