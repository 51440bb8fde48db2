import { bounds } from '../bounds.ts';
import type { Features } from '../features/schema.ts';
import type { Counts } from './counts.ts';
import type { Block, Fit } from './fit.ts';
import { fitQueues, fitShared, type LabelledScores, type Shrinkage } from './fit-exponents.ts';
import { chooseHold, holdAll } from './prune.ts';
import { blockScores } from './score.ts';
import { createScorer, type Scorer } from './scorer.ts';
import { project, serve, weightOf } from './served-table.ts';

/** A confirmed message that stands in the counts. */
export interface FoldedMessage {
  readonly features: Features;
  readonly queue: string;
  readonly epoch: number;
}

export interface FitOptions {
  readonly halfLifeDays: number | null;
}

/** What is known before: a few dozen messages' worth for the shared exponents, so that a desk's first fits stay near what
 *  serves most desks; more for single queues, of which there are many. Any value from a half to twice these fits as well. */
const shrinkage: Shrinkage = { shared: 10, queue: 20, bias: 10 };

/** Exponents that minimise the log loss of leave-one-out scores, first shared by all queues and shrunk towards the last fit,
 *  then by queue, shrunk towards the shared ones. Every message of the sample must stand in the counts; at most
 *  `fitMessagesMax` are used (fewer of many queues, see `fitScoresMax`), evenly spread over the sample's order. Deterministic.
 *  Cost: O(messages · queues · (tokens + blocks²)). */
export function fitTable(
  counts: Counts,
  sample: readonly FoldedMessage[],
  previousFit: Fit,
  options: FitOptions = { halfLifeDays: null },
): Fit {
  const { projected, referenceEpoch } = project(counts, options.halfLifeDays);
  const hold = chooseHold(counts, projected, previousFit, referenceEpoch);
  const table = serve(counts, { ...previousFit, hold: holdAll }, options);
  const queues = table.counts.columns.map((c) => c.queue);
  const messagesMax = Math.floor(bounds.fitScoresMax / (queues.length * previousFit.blocks.length));
  const own = spread(sample, Math.min(bounds.fitMessagesMax, messagesMax))
    .map(({ features, queue, epoch }) => ({
      features,
      queue: queues.indexOf(queue),
      weight: weightOf(epoch, table.referenceEpoch, options.halfLifeDays),
    }))
    .filter((message) => message.queue >= 0 && message.weight > 0);
  if (own.length === 0 || queues.length < 2) return { ...previousFit, hold };
  const scorer = createScorer(table, [], queues, options.halfLifeDays, {
    isForFit: true,
    seenMin: hold.sparesNew ? 0 : hold.seenMin,
  });
  const { active, scores } = leaveOneOut(scorer, own);
  const before = Float64Array.from(active, (b) => previousFit.blocks[b].exponent);
  const shared = fitShared(scores, before, shrinkage);
  const byQueue = fitQueues(scores, shared, shrinkage);
  return {
    ...previousFit,
    blocks: previousFit.blocks.map((block, b): Block => {
      const at = active.indexOf(b);
      if (at < 0) return { ...block, byQueue: {} };
      const own = queues.map(
        (queue, k) => [queue, rounded(byQueue.exponents[k * active.length + at])] as const,
      );
      const exponent = rounded(shared[at]);
      return { ...block, exponent, byQueue: Object.fromEntries(own.filter(([, w]) => w !== exponent)) };
    }),
    bias: Object.fromEntries(queues.map((queue, k) => [queue, rounded(byQueue.bias[k])])),
    hold,
    logLoss: byQueue.logLoss,
    messages: own.length,
  };
}

/** Leave-one-out scores of the blocks that score anything at all (`active`). */
function leaveOneOut(
  scorer: Scorer,
  own: readonly { readonly features: Features; readonly queue: number; readonly weight: number }[],
): { readonly active: readonly number[]; readonly scores: LabelledScores } {
  const queues = scorer.queues.length;
  const blocks = scorer.fit.blocks.length;
  const x = new Float32Array(own.length * queues * blocks);
  const isActive = new Array<boolean>(blocks).fill(false);
  own.forEach((message, i) => {
    const scores = blockScores(scorer, message.features, message);
    for (let b = 0; b < blocks; b++) {
      for (let k = 0; k < queues; k++) {
        x[(i * queues + k) * blocks + b] = scores[b * queues + k];
        if (scores[b * queues + k] !== 0) isActive[b] = true;
      }
    }
  });
  const active = [...isActive.keys()].filter((b) => isActive[b]);
  // Moved forward in place: no score is overwritten before it is read.
  const rows = own.length * queues;
  for (let row = 0; row < rows; row++)
    active.forEach((b, at) => {
      x[row * active.length + at] = x[row * blocks + b];
    });
  return {
    active,
    scores: {
      messages: own.length,
      queues,
      blocks: active.length,
      x,
      truth: Uint32Array.from(own, (m) => m.queue),
    },
  };
}

/** Four decimals move no posterior that is written, and keep the table small. */
function rounded(exponent: number): number {
  return Math.round(exponent * 1e4) / 1e4;
}

/** At most `max` items, evenly spaced and in order. */
function spread<T>(items: readonly T[], max: number): T[] {
  if (items.length <= max) return [...items];
  return Array.from({ length: max }, (_, i) => items[Math.floor((i * items.length) / max)]);
}
