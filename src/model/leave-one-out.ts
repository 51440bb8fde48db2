import { bounds } from '../bounds.ts';
import type { Features } from '../features/schema.ts';
import type { LabelledScores } from './fit-exponents.ts';
import type { Own } from './hits.ts';
import { blockScores } from './score.ts';
import type { Scorer } from './scorer.ts';

/** A folded message, with what it weighs in the counts and its place in the sample it came from. */
export interface OwnMessage extends Own {
  readonly index: number;
  readonly features: Features;
}

export interface LeaveOneOut {
  /** Blocks that tell queues apart at all, by their place in the fit. */
  readonly active: readonly number[];
  readonly own: readonly OwnMessage[];
  readonly scores: LabelledScores;
}

/** Block scores of folded messages as if each had not been folded. At most `fitMessagesMax` of them, fewer where
 *  `fitScoresMax` asks for it, evenly spread over their order. */
export function scoreLeavingOut(scorer: Scorer, messages: readonly OwnMessage[]): LeaveOneOut {
  const active = findActive(scorer, messages);
  const queues = scorer.queues.length;
  const blocks = active.length;
  const max = Math.min(bounds.fitMessagesMax, Math.floor(bounds.fitScoresMax / Math.max(1, queues * blocks)));
  const own = spread(messages, max);
  const x = new Float32Array(own.length * queues * blocks);
  own.forEach((message, i) => {
    const scores = blockScores(scorer, message.features, message);
    for (let b = 0; b < blocks; b++) {
      for (let k = 0; k < queues; k++) x[(i * queues + k) * blocks + b] = scores[active[b] * queues + k];
    }
  });
  const truth = Uint32Array.from(own, (message) => message.queue);
  return { active, own, scores: { messages: own.length, queues, blocks, x, truth } };
}

/** A slot that has the same value in all messages tells nothing, nor does a region that is empty in all. */
const tellingNats = 0.01;
const probeMessages = 200;

function findActive(scorer: Scorer, messages: readonly OwnMessage[]): number[] {
  const queues = scorer.queues.length;
  const scores = spread(messages, probeMessages).map((message) =>
    blockScores(scorer, message.features, message),
  );
  return [...scorer.fit.blocks.keys()].filter((b) =>
    scores.some((x) => {
      const block = x.subarray(b * queues, (b + 1) * queues);
      return Math.max(...block) - Math.min(...block) > tellingNats;
    }),
  );
}

/** At most `max` items, evenly spaced and in order. */
function spread<T>(items: readonly T[], max: number): readonly T[] {
  if (items.length <= max) return items;
  return Array.from({ length: max }, (_, i) => items[Math.floor((i * items.length) / max)]);
}
