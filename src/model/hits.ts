import type { RegionCounts } from './counts.ts';

/** One token's non-zero counts: queue[i] holds count[i], i < length; `seen` is their sum D. */
export interface Hits {
  readonly queue: Uint32Array;
  readonly count: Float64Array;
  length: number;
  seen: number;
}

/** A folded message that is scored as if it had not been folded. */
export interface Own {
  /** Index of the queue under which it stands. */
  readonly queue: number;
  /** Its weight in that queue's counts. */
  readonly weight: number;
}

export function createHits(queues: number): Hits {
  return { queue: new Uint32Array(queues), count: new Float64Array(queues), length: 0, seen: 0 };
}

/** Fills `hits` with a row's counts by queue, those of a message left out. `queueOf` takes a column to a queue, -1 to none. */
export function readHits(
  { start, column, count }: RegionCounts,
  queueOf: Int32Array,
  row: number,
  own: Own | null,
  hits: Hits,
): void {
  hits.length = 0;
  hits.seen = 0;
  for (let p = start[row]; p < start[row + 1]; p++) {
    const k = queueOf[column[p]];
    if (k < 0) continue;
    const left = own !== null && k === own.queue ? count[p] - own.weight : count[p];
    if (left <= 0) continue;
    hits.queue[hits.length] = k;
    hits.count[hits.length++] = left;
    hits.seen += left;
  }
}

/** Which queues hold the one or two sightings of a token; -1 for any other token. Tokens of one kind score the same, and most
 *  tokens are of one of these. */
export function kindOf({ seen, length, queue, count }: Hits, queues: number): number {
  if (seen === 1 && length === 1) return queue[0];
  if (seen !== 2 || (length === 2 && count[0] !== 1)) return -1;
  const [a, b] = length === 1 ? [queue[0], queue[0]] : [queue[0], queue[1]];
  return queues * (1 + Math.min(a, b)) + Math.max(a, b);
}
