import type { Features } from '../features/schema.ts';
import { priorScore, slotScore } from './closed-scores.ts';
import { schemaMismatch } from './fold.ts';
import type { Own } from './hits.ts';
import type { Scorer, ScorerReading } from './scorer.ts';
import { locate, type ScorerRegion } from './scorer-region.ts';
import { emptySums, partOf, type ReadingSums } from './sums.ts';
import { createView, tokenRatios, type View, viewLeaving } from './view.ts';

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
      if (slot.group === block.group) add(b, slotScore(scorer, j, features.slots[j], own, block.base));
    });
  });
  scorer.readings.forEach((readings, g) => {
    const scale = lengthScale(features.regions[g].length);
    const rows = Int32Array.from(features.regions[g], (token) => locate(scorer.regions[g], token));
    for (const reading of readings) {
      const sums = sumTokens(scorer.regions[g], viewOf(scorer.regions[g], reading, rows, own), rows);
      for (const { index, part } of reading.blocks) add(index, partOf(sums, part), scale);
    }
  });
  return scores;
}

/** Words of one message depend on each other, so that their product would be far too sure: it is divided by
 *  √(1 + tokens of the region in the message), known or not. */
export function lengthScale(tokens: number): number {
  return 1 / Math.sqrt(1 + tokens);
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

function viewOf(region: ScorerRegion, reading: ScorerReading, rows: Int32Array, own: Own | null): View {
  if (own === null) return reading.view;
  const { exposure } = reading.view;
  if (exposure.reading.draws === 'tokens') return viewLeaving(region, exposure, rows, own);
  const key = `${own.queue} ${own.weight}`;
  const known = reading.leaving.get(key) ?? createView(region, exposure, reading.countsAbsent, own);
  reading.leaving.set(key, known);
  return known;
}
