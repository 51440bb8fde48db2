import { bounds } from '../bounds.ts';
import type { Features } from '../features/schema.ts';
import { schemaMismatch } from './fold.ts';
import { type Exposure, exposureWithout, type Hits, rateRatios } from './rates.ts';
import {
  absentFactors,
  absentSum,
  clampHits,
  createHits,
  readHits,
  rowOf,
  type Scorer,
  type ScorerReading,
  type ScorerRegion,
  type TokenLogs,
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
  const rows = Int32Array.from(present, (token) => rowOf(region, token));
  const exposure = own === null ? reading.exposure : exposureLeaving(scorer, g, reading, rows, own);
  const contribution = new Float64Array(queues);
  if (reading.countsAbsent) {
    const all = own === null ? reading.absent : absentLeaving(scorer, g, reading, own);
    for (const { index, part } of reading.blocks)
      if (part === 'all' || part === 'absent') visit(index, -1, all);
  }
  for (let t = 0; t < rows.length; t++) {
    if (rows[t] < 0) continue;
    const { present: logs, absent } =
      own === null ? logsOf(region, reading, rows[t]) : logsLeaving(region, reading, rows[t], exposure, own);
    for (const { index, part } of reading.blocks) {
      for (let k = 0; k < queues; k++) {
        if (part === 'all') contribution[k] = logs[k] - (absent === null ? 0 : absent[k]);
        else if (part === 'for') contribution[k] = Math.max(logs[k], 0);
        else if (part === 'against') contribution[k] = Math.min(logs[k], 0);
        else contribution[k] = absent === null ? 0 : -absent[k];
      }
      visit(index, t, contribution);
    }
  }
}

/** A row's logs as the table stands; remembered, since a few thousand tokens make up most of all mail. */
function logsOf(region: ScorerRegion, reading: ScorerReading, row: number): TokenLogs {
  const known = reading.remembered.get(row);
  if (known) return known;
  const hits = createHits(reading.exposure.draws.length);
  readHits(region, row, -1, 0, hits);
  const logs = {
    present: presentLogs(reading.exposure, hits),
    absent: reading.countsAbsent ? absentLogs(reading.exposure, hits) : null,
  };
  if (reading.remembered.size * hits.queue.length < bounds.rememberedLogsMax)
    reading.remembered.set(row, logs);
  return logs;
}

/** A row's logs without the message: what it adds when present, and what had been summed for it as absent. */
function logsLeaving(
  region: ScorerRegion,
  reading: ScorerReading,
  row: number,
  exposure: Exposure,
  own: Own,
): TokenLogs {
  const hits = createHits(exposure.draws.length);
  let absent: Float64Array | null = null;
  if (reading.countsAbsent) {
    readHits(region, row, -1, 0, hits);
    absent = absentLogs(exposure, hits);
  }
  readHits(region, row, own.queue, own.weight, hits);
  return { present: presentLogs(exposure, hits), absent };
}

/** log p_k/m; 0 for a token that nothing holds; [queues]. */
function presentLogs(exposure: Exposure, hits: Hits): Float64Array {
  const logs = new Float64Array(exposure.draws.length);
  if (hits.length === 0) return logs;
  rateRatios(exposure, hits, logs);
  for (let k = 0; k < logs.length; k++) logs[k] = Math.log(logs[k]);
  return logs;
}

/** log (1 - p_k)/(1 - m); [queues]. */
function absentLogs(exposure: Exposure, hits: Hits): Float64Array {
  if (hits.length === 0) return new Float64Array(exposure.draws.length);
  clampHits(hits, exposure);
  return absentFactors(exposure, hits).map(Math.log);
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
