import { bounds } from '../bounds.ts';
import { createHits, type Hits, kindOf, type Own } from './hits.ts';
import { type Exposure, exposureWithout, pooledRate, rateRatios } from './rates.ts';
import { readRow, type ScorerRegion } from './scorer-region.ts';

/** One reading of a region as a message sees it: the whole table, or the table without that message. */
export interface View {
  readonly exposure: Exposure;
  /** The message that is left out. */
  readonly own: Own | null;
  /** Σ_t log((1 - p_kt)/(1 - m_t)) over all tokens held, as if none were present; null where absence is not counted; [queues]. */
  readonly absent: Float64Array | null;
  /** Ratios of rows that were asked for before. Null where they are asked for once: the whole table's are remembered with their
   *  exponents (see token-scores), and a view may serve one message only. */
  readonly remembered: Map<number, TokenRatios> | null;
  /** Work space. */
  readonly hits: Hits;
  readonly present: Float64Array;
}

/** What a token multiplies the odds by, before exponents: p_k/m when present, (1 - p_k)/(1 - m) when absent (null where that
 *  is not counted); [queues]. */
export interface TokenRatios {
  readonly present: Float64Array;
  readonly absent: Float64Array | null;
}

/** The view of the whole table, or without a message when `own` is given and messages are drawn: what it takes out of the
 *  exposures is then the same for every message of its queue and weight. */
export function createView(
  region: ScorerRegion,
  exposure: Exposure,
  countsAbsent: boolean,
  own: Own | null = null,
): View {
  const left = own === null ? exposure : exposureWithout(exposure, own.queue, own.weight, 0);
  return {
    exposure: left,
    own,
    absent: countsAbsent ? absentSum(region, left) : null,
    remembered: own === null ? null : new Map(),
    hits: createHits(left.draws.length),
    present: new Float64Array(left.draws.length),
  };
}

/** The view without a message when tokens are drawn: its tokens leave the exposure, and those that only it holds leave the
 *  vocabulary. `rows` are its tokens' rows, -1 for those that the table does not hold. */
export function viewLeaving(region: ScorerRegion, exposure: Exposure, rows: Int32Array, own: Own): View {
  const hits = createHits(exposure.draws.length);
  let only = 0;
  for (const row of rows) {
    if (row < 0) continue;
    readRow(region, row, own, hits);
    if (hits.length === 0) only++;
  }
  const left = exposureWithout(exposure, own.queue, own.weight * rows.length, only);
  return {
    exposure: left,
    own,
    absent: null,
    remembered: null,
    hits,
    present: new Float64Array(left.draws.length),
  };
}

/** The ratios of one row; unless they are remembered, good until the next call. */
export function tokenRatios(region: ScorerRegion, view: View, row: number): TokenRatios {
  const known = view.remembered?.get(row);
  if (known) return known;
  const { exposure, own, hits } = view;
  const queues = exposure.draws.length;
  const isRemembered = view.remembered !== null && view.remembered.size * queues < bounds.rememberedRatiosMax;
  let absent: Float64Array | null = null;
  if (view.absent !== null) {
    // As summed in view.absent: with the message's own count, which the sum over all tokens could not know to leave out.
    readRow(region, row, null, hits);
    absent = isHeld(region, hits) ? absentFactors(exposure, hits) : new Float64Array(queues).fill(1);
  }
  readRow(region, row, own, hits);
  const present = isRemembered ? new Float64Array(queues) : view.present;
  if (isHeld(region, hits)) rateRatios(exposure, hits, present);
  else present.fill(1);
  const ratios = { present, absent };
  if (isRemembered) view.remembered?.set(row, ratios);
  return ratios;
}

/** Σ_t log((1 - p_kt)/(1 - m_t)) over all tokens of a region. Tokens seen once or twice, most of all, fall into few kinds
 *  that add the same; of the others the factors are multiplied, and a logarithm is taken only when the product nears the end
 *  of the range. O(cells + tokens · queues). Shape: [queues]. */
export function absentSum(region: ScorerRegion, exposure: Exposure): Float64Array {
  const queues = exposure.draws.length;
  const hits = createHits(queues);
  const product = new Float64Array(queues).fill(1);
  const sum = new Float64Array(queues);
  const kinds = new Map<number, { readonly factors: Float64Array; times: number }>();
  for (let row = 0; row < region.rows; row++) {
    readRow(region, row, null, hits);
    if (!isHeld(region, hits)) continue;
    const kind = kindOf(hits, queues);
    const same = kinds.get(kind);
    if (same) {
      same.times++;
      continue;
    }
    const factors = absentFactors(exposure, hits);
    if (kind >= 0) {
      kinds.set(kind, { factors, times: 1 });
      continue;
    }
    for (let k = 0; k < queues; k++) {
      product[k] *= factors[k];
      if (product[k] > 1e200 || product[k] < 1e-200) {
        sum[k] += Math.log(product[k]);
        product[k] = 1;
      }
    }
  }
  for (const { factors, times } of kinds.values()) {
    for (let k = 0; k < queues; k++) sum[k] += times * Math.log(factors[k]);
  }
  return sum.map((s, k) => s + Math.log(product[k]));
}

/** (1 - p_k)/(1 - m) of one token; [queues]. Hits are capped at the draws: they are more only where a message's draw was
 *  taken out and a token was in every message of its queue, that one included; its logs are then corrected for. */
function absentFactors(exposure: Exposure, hits: Hits): Float64Array {
  hits.seen = 0;
  for (let h = 0; h < hits.length; h++) {
    hits.count[h] = Math.min(hits.count[h], exposure.draws[hits.queue[h]]);
    hits.seen += hits.count[h];
  }
  const factors = new Float64Array(exposure.draws.length);
  rateRatios(exposure, hits, factors);
  const m = pooledRate(exposure, hits.seen);
  for (let k = 0; k < factors.length; k++) factors[k] = (1 - factors[k] * m) / (1 - m);
  return factors;
}

function isHeld(region: ScorerRegion, hits: Hits): boolean {
  return hits.length > 0 && hits.seen >= region.seenMin;
}
