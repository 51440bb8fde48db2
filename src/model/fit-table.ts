import { bounds } from '../bounds.ts';
import type { Features } from '../features/schema.ts';
import type { Counts } from './counts.ts';
import type { Block, Fit } from './fit.ts';
import { minimiseNonNegative, type Point } from './minimise.ts';
import { normalise } from './posterior-of.ts';
import { blockScores } from './score.ts';
import { createScorer, type Scorer } from './scorer.ts';
import { serve, weightOf } from './served-table.ts';

/** A confirmed message that stands in the counts. */
export interface FoldedMessage {
  readonly features: Features;
  readonly queue: string;
  readonly epoch: number;
}

export interface FitOptions {
  readonly halfLifeDays: number | null;
}

/** Exponents that minimise the mean log loss of leave-one-out scores, shrunk towards the last fit as if that rested on a
 *  few messages. Every message of the sample must stand in the counts. Uses at most `fitMessagesMax` of them, evenly spread
 *  over the sample's order. Deterministic. Cost: O(messages · queues · (tokens + blocks²)). */
export function fitTable(
  counts: Counts,
  sample: readonly FoldedMessage[],
  previousFit: Fit,
  options: FitOptions = { halfLifeDays: null },
): Fit {
  const table = serve(counts, previousFit, options);
  const queues = table.counts.columns.map((c) => c.queue);
  const scorer = createScorer(table, [], queues, options.halfLifeDays);
  const used = spread(sample, bounds.fitMessagesMax)
    .map((message) => ({
      features: message.features,
      queue: queues.indexOf(message.queue),
      weight: weightOf(message.epoch, table.referenceEpoch, options.halfLifeDays),
    }))
    .filter((message) => message.queue >= 0 && message.weight > 0);
  if (used.length === 0 || queues.length < 2) return previousFit;
  const scores = used.map((own) => blockScores(scorer, own.features, own));
  const truth = used.map((own) => own.queue);
  const blocks = previousFit.blocks;
  const last = Float64Array.from(blocks, (block) => block.exponent);
  const { w } = minimiseNonNegative((at) => lossAt(at, scores, truth, scorer, last), last, 50);
  return {
    ...previousFit,
    blocks: blocks.map((block, b): Block => ({ ...block, exponent: w[b] })),
    logLoss: lossAt(w, scores, truth, scorer, w).value,
    messages: used.length,
  };
}

/** How much the last fit counts: (w - last)² of every exponent, as many nats in all, however many messages there are. */
const shrinkage = 1;

/** Mean log loss at exponents w, with its derivatives, plus shrinkage · Σ (w - last)² / messages. */
function lossAt(
  w: Float64Array,
  scores: readonly Float64Array[],
  truth: readonly number[],
  scorer: Scorer,
  last: Float64Array,
): Point {
  const blocks = w.length;
  const queues = scorer.queues.length;
  const gradient = new Float64Array(blocks);
  const hessian = new Float64Array(blocks * blocks);
  const mean = new Float64Array(blocks);
  let value = 0;
  scores.forEach((x, i) => {
    const sum = new Float64Array(queues);
    for (let b = 0; b < blocks; b++) for (let k = 0; k < queues; k++) sum[k] += w[b] * x[b * queues + k];
    const logs = normalise(sum);
    value -= logs[truth[i]];
    mean.fill(0);
    for (let k = 0; k < queues; k++) {
      const p = Math.exp(logs[k]);
      if (p < 1e-9) continue;
      for (let b = 0; b < blocks; b++) {
        const px = p * x[b * queues + k];
        mean[b] += px;
        for (let c = 0; c <= b; c++) hessian[b * blocks + c] += px * x[c * queues + k];
      }
    }
    for (let b = 0; b < blocks; b++) {
      gradient[b] += mean[b] - x[b * queues + truth[i]];
      for (let c = 0; c <= b; c++) hessian[b * blocks + c] -= mean[b] * mean[c];
    }
  });
  for (let b = 0; b < blocks; b++) {
    value += shrinkage * (w[b] - last[b]) ** 2;
    gradient[b] += 2 * shrinkage * (w[b] - last[b]);
    hessian[b * blocks + b] += 2 * shrinkage;
    for (let c = 0; c < b; c++) hessian[c * blocks + b] = hessian[b * blocks + c];
  }
  const n = scores.length;
  return { value: value / n, gradient: gradient.map((g) => g / n), hessian: hessian.map((h) => h / n) };
}

/** At most `max` items, evenly spaced and in order. */
function spread<T>(items: readonly T[], max: number): T[] {
  if (items.length <= max) return [...items];
  return Array.from({ length: max }, (_, i) => items[Math.floor((i * items.length) / max)]);
}
