import type { Features } from '../features/schema.ts';
import type { TokensBlock } from './fit.ts';
import { schemaMismatch } from './fold.ts';
import type { Own } from './hits.ts';
import { rowOf, type Scorer, type ScorerReading, type ScorerRegion } from './scorer.ts';
import { createView, type TokenRatios, tokenRatios, type View, viewLeaving } from './view.ts';

/** Each block's score, before exponents: nats; [blocks * queues], block-major. With `own` the message's contribution is
 *  taken out of its queue's counts and exposures first (leave-one-out), exactly as unfolding it would.
 *  Throws TallypostError `schema-mismatch`. Cost: O(queues · present known tokens · readings). */
export function blockScores(scorer: Scorer, features: Features, own: Own | null = null): Float64Array {
  if (features.schema !== scorer.schema.id)
    throw schemaMismatch('features', scorer.schema.id, features.schema);
  const queues = scorer.queues.length;
  const scores = new Float64Array(scorer.fit.blocks.length * queues);
  const add = (block: number, addend: Float64Array, scale = 1) => {
    for (let k = 0; k < queues; k++) scores[block * queues + k] += scale * addend[k];
  };
  scorer.fit.blocks.forEach((block, b) => {
    if (block.kind === 'prior') add(b, priorScore(scorer, own));
    if (block.kind !== 'slots') return;
    scorer.schema.slots.forEach((slot, j) => {
      if (slot.group === block.group) add(b, slotScore(scorer, j, features.slots[j], own));
    });
  });
  scorer.readings.forEach((readings, g) => {
    const scale = lengthScale(features.regions[g].length);
    const rows = Int32Array.from(features.regions[g], (token) => rowOf(scorer.regions[g], token));
    for (const reading of readings) {
      const sums = sumTokens(scorer.regions[g], viewOf(scorer.regions[g], reading, rows, own), rows);
      for (const { index, part } of reading.blocks) add(index, partOf(sums, part), scale);
    }
  });
  return scores;
}

/** log (α + c_k)/(K α + n); [queues]. */
export function priorScore(scorer: Scorer, own: Own | null): Float64Array {
  const { alpha } = scorer.fit;
  const c = countsWithout(scorer.messages, own);
  const whole = c.reduce((sum, n) => sum + alpha + n, 0);
  return c.map((n) => Math.log((alpha + n) / whole));
}

/** log (β + d_jk(v))/(N_j β + c_k), the posterior predictive of slot j's value v under a symmetric Dirichlet prior; [queues].
 *  Source: Murphy, Machine Learning (2012), section 3.4. */
export function slotScore(scorer: Scorer, slot: number, value: number, own: Own | null): Float64Array {
  const queues = scorer.queues.length;
  const { id, values } = scorer.schema.slots[slot];
  const beta = scorer.fit.beta[id] ?? 1;
  const d = countsWithout(scorer.slots[slot].subarray(value * queues, (value + 1) * queues), own);
  const c = countsWithout(scorer.messages, own);
  return d.map((n, k) => Math.log((beta + n) / (values.length * beta + c[k])));
}

/** Words of one message depend on each other, so that their product would be far too sure: it is divided by
 *  √(1 + tokens of the region in the message), known or not. */
export function lengthScale(tokens: number): number {
  return 1 / Math.sqrt(1 + tokens);
}

/** Sums over a message's tokens, before length scaling and exponents; each [queues]. */
export interface ReadingSums {
  /** Σ log p_k/m of present tokens where it is above 0, and where below. */
  readonly for: Float64Array;
  readonly against: Float64Array;
  /** Σ log (1 - p_k)/(1 - m) over the tokens that are absent. */
  readonly absent: Float64Array;
}

/** Ratios are multiplied and a logarithm is taken only when a product nears the end of the range: a multiplication a token and
 *  queue in place of a logarithm. */
function sumTokens(region: ScorerRegion, view: View, rows: Int32Array): ReadingSums {
  const queues = view.exposure.draws.length;
  const sums = emptySums(queues);
  if (view.absent !== null) sums.absent.set(view.absent);
  const products = emptySums(queues, 1);
  for (const row of rows) {
    if (row < 0) continue;
    const { present, absent } = tokenRatios(region, view, row);
    for (let k = 0; k < queues; k++) {
      if (present[k] > 1) {
        products.for[k] *= present[k];
        if (products.for[k] > 1e200) flush(products.for, sums.for, k);
      } else {
        products.against[k] *= present[k];
        if (products.against[k] < 1e-200) flush(products.against, sums.against, k);
      }
    }
    if (absent === null) continue;
    for (let k = 0; k < queues; k++) {
      products.absent[k] /= absent[k];
      if (products.absent[k] > 1e200 || products.absent[k] < 1e-200) flush(products.absent, sums.absent, k);
    }
  }
  for (let k = 0; k < queues; k++) {
    flush(products.for, sums.for, k);
    flush(products.against, sums.against, k);
    flush(products.absent, sums.absent, k);
  }
  return sums;
}

function flush(product: Float64Array, sum: Float64Array, k: number): void {
  sum[k] += Math.log(product[k]);
  product[k] = 1;
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

function viewOf(region: ScorerRegion, reading: ScorerReading, rows: Int32Array, own: Own | null): View {
  if (own === null) return reading.view;
  const { exposure } = reading.view;
  if (exposure.reading.draws === 'tokens') return viewLeaving(region, exposure, rows, own);
  const key = `${own.queue} ${own.weight}`;
  const known = reading.leaving.get(key) ?? createView(region, exposure, reading.countsAbsent, own);
  reading.leaving.set(key, known);
  return known;
}

function countsWithout(counts: Float64Array, own: Own | null): Float64Array {
  if (own === null) return counts;
  const less = counts.slice();
  less[own.queue] -= own.weight;
  return less;
}
