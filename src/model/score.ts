import type { Features } from '../features/schema.ts';
import { schemaMismatch } from './fold.ts';
import { type Exposure, exposureWithout, type Hits, pooledRate, rateRatios, weighModels } from './rates.ts';
import {
  absentSum,
  clampHits,
  createHits,
  readHits,
  rowOf,
  type Scorer,
  type ScorerReading,
} from './scorer.ts';

/** A folded message that is scored as if it had not been folded. */
export interface Own {
  /** Index of the queue under which it stands. */
  readonly queue: number;
  /** Its weight in that queue's counts. */
  readonly weight: number;
}

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
    for (const reading of readings) {
      visitContributions(scorer, g, reading, features.regions[g], own, (block, _, contribution) =>
        add(block, contribution, scale),
      );
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

/** Calls `visit` with what each present token adds to each block of a reading, before length scaling and exponents, and
 *  with what all absent tokens add together (token index -1). The array is reused between calls; [queues]. */
export function visitContributions(
  scorer: Scorer,
  g: number,
  reading: ScorerReading,
  present: Float64Array,
  own: Own | null,
  visit: (block: number, token: number, contribution: Float64Array) => void,
): void {
  const queues = scorer.queues.length;
  const region = scorer.regions[g];
  const isPresence = reading.exposure.reading.draws === 'messages';
  const hits = createHits(queues);
  const rows = Int32Array.from(present, (token) => rowOf(region, token));
  const exposure = own === null ? reading.exposure : exposureLeaving(scorer, g, reading, rows, own);
  const weights = new Float64Array(exposure.reading.concentrations.length + 1);
  const logs = new Float64Array(queues);
  const absent = new Float64Array(queues);
  const contribution = new Float64Array(queues);

  if (isPresence) {
    const all = own === null ? reading.absent : absentLeaving(scorer, g, reading, own);
    for (const { index, part } of reading.blocks)
      if (part === 'all' || part === 'absent') visit(index, -1, all);
  }
  for (let t = 0; t < rows.length; t++) {
    if (rows[t] < 0) continue;
    if (isPresence) {
      readHits(region, rows[t], -1, 0, hits);
      absentLogs(exposure, hits, weights, absent);
    }
    readHits(region, rows[t], own === null ? -1 : own.queue, own === null ? 0 : own.weight, hits);
    if (hits.length > 0) presentLogs(exposure, hits, weights, logs);
    else logs.fill(0);
    for (const { index, part } of reading.blocks) {
      for (let k = 0; k < queues; k++) {
        const log = logs[k];
        contribution[k] =
          part === 'all'
            ? log - absent[k]
            : part === 'for'
              ? Math.max(log, 0)
              : part === 'against'
                ? Math.min(log, 0)
                : -absent[k];
      }
      visit(index, t, contribution);
    }
  }
}

/** log p_k/m; [queues]. */
function presentLogs(exposure: Exposure, hits: Hits, weights: Float64Array, out: Float64Array): void {
  clampHits(hits, exposure);
  weighModels(exposure, hits, weights);
  rateRatios(exposure, hits, weights, out);
  for (let k = 0; k < out.length; k++) out[k] = Math.log(out[k]);
}

/** log (1 - p_k)/(1 - m); [queues]. */
function absentLogs(exposure: Exposure, hits: Hits, weights: Float64Array, out: Float64Array): void {
  if (hits.length === 0) {
    out.fill(0);
    return;
  }
  clampHits(hits, exposure);
  weighModels(exposure, hits, weights);
  rateRatios(exposure, hits, weights, out);
  const m = pooledRate(exposure, hits.seen);
  for (let k = 0; k < out.length; k++) out[k] = Math.log((1 - out[k] * m) / (1 - m));
}

/** The exposure as it would be had the message not been folded: its draws, and the tokens that only it holds. */
function exposureLeaving(
  scorer: Scorer,
  g: number,
  reading: ScorerReading,
  rows: Int32Array,
  own: Own,
): Exposure {
  const { exposure } = reading;
  if (exposure.reading.draws === 'messages') return exposureWithout(exposure, own.queue, own.weight, 0);
  const hits = createHits(scorer.queues.length);
  let only = 0;
  for (const row of rows) {
    if (row < 0) continue;
    readHits(scorer.regions[g], row, own.queue, own.weight, hits);
    if (hits.length === 0) only++;
  }
  return exposureWithout(exposure, own.queue, own.weight * rows.length, only);
}

/** The absent tokens' sum with the message's draw taken out. It depends on the message through its queue and weight only,
 *  since every token of the message itself is corrected for afterwards. */
function absentLeaving(scorer: Scorer, g: number, reading: ScorerReading, own: Own): Float64Array {
  const key = `${own.queue} ${own.weight}`;
  let known = reading.absentLeaving.get(key);
  if (known === undefined) {
    known = absentSum(scorer.regions[g], exposureWithout(reading.exposure, own.queue, own.weight, 0));
    reading.absentLeaving.set(key, known);
  }
  return known;
}

function countsWithout(counts: Float64Array, own: Own | null): Float64Array {
  if (own === null) return counts;
  const less = counts.slice();
  less[own.queue] -= own.weight;
  return less;
}
