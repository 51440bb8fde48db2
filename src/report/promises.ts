import { bandEdges, recordBands } from '../model/record.ts';
import { estimate } from './estimate.ts';
import type { PromiseBand, Promises } from './report-data.ts';

/** Fewer confirmations than this and a band is joined with the next: an interval from fewer says nothing. */
const bandMessagesMin = 30;

/** From here on bands are one: over 99 % nobody acts differently, and their edges (99.48 %, 99.75 %) only puzzle. */
const surelyBand = 10;

/** The reliability record by bands of the stated probability, neighbouring bands joined until each holds enough.
 *  `record`: [bands * 4], see Counts. Counts below zero (a correction whose base was aged) count as none. */
export function readPromises(record: Float64Array): Promises {
  const edges = bandEdges();
  const bands: PromiseBand[] = [];
  let from = 0;
  let hits = 0;
  let misses = 0;
  const audit = { hits: 0, misses: 0 };
  for (let b = 0; b < recordBands; b += 1) {
    const [hit, miss, auditHit, auditMiss] = Array.from(record.subarray(4 * b, 4 * b + 4), (n) =>
      Math.max(0, n),
    ) as [number, number, number, number];
    hits += hit + auditHit;
    misses += miss + auditMiss;
    audit.hits += auditHit;
    audit.misses += auditMiss;
    const isLast = b === recordBands - 1;
    if ((hits + misses < bandMessagesMin || b >= surelyBand) && !isLast) continue;
    if (hits + misses > 0) bands.push(bandOf(from, edges[b + 1] as number, hits, misses));
    from = edges[b + 1] as number;
    hits = 0;
    misses = 0;
  }
  return { bands, audit: estimate(audit.hits, audit.hits + audit.misses) };
}

function bandOf(from: number, to: number, hits: number, misses: number): PromiseBand {
  const cameTrue = estimate(hits, hits + misses);
  return { from, to, cameTrue, verdict: verdictOf(from, to, hits + misses, cameTrue) };
}

/** A promise is broken when the whole interval lies outside of what was said. */
function verdictOf(
  from: number,
  to: number,
  of: number,
  { low, high }: PromiseBand['cameTrue'],
): PromiseBand['verdict'] {
  if (of < bandMessagesMin) return 'too-few';
  if (high < from) return 'too-high';
  return low > to ? 'too-low' : 'kept';
}
