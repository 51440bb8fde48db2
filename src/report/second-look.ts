import type { Features } from '../features/schema.ts';
import { combine, normalise } from '../model/posterior-of.ts';
import { weightOf } from '../model/projection.ts';
import { blockScores } from '../model/score.ts';
import type { Scorer } from '../model/scorer.ts';
import type { SecondLook } from './report-data.ts';

/** A confirmed message that stands in the counts. */
export interface Folded {
  readonly message: string;
  readonly queue: string;
  readonly epoch: number;
  readonly by: string;
  readonly at: string;
  readonly features: Features;
}

/** A confirmed queue less likely than this, judged by all other messages, is worth a second look. */
export const contradictedBelow = 0.01;

/** Confirmations that everything else contradicts: each message is scored as if it had not been counted (leave-one-out).
 *  Least likely first. */
export function contradicted(
  scorer: Scorer,
  folded: readonly Folded[],
  age: { readonly referenceEpoch: number; readonly halfLifeDays: number | null },
): SecondLook[] {
  const found: SecondLook[] = [];
  for (const { message, queue, epoch, by, at, features } of folded) {
    const own = scorer.queues.indexOf(queue);
    const weight = weightOf(epoch, age.referenceEpoch, age.halfLifeDays);
    // With nothing else in the queue, nothing else can say that the message does not belong there.
    if (own < 0 || (scorer.messages[own] as number) - weight < 1) continue;
    const scores = blockScores(scorer, features, { queue: own, weight });
    const probability = normalise(combine(scorer, scores)).map(Math.exp);
    const top = probability.indexOf(Math.max(...probability));
    if (top === own || (probability[own] as number) >= contradictedBelow) continue;
    found.push({
      message,
      confirmed: queue,
      by,
      at,
      likelier: scorer.queues[top] as string,
      likelierProbability: probability[top] as number,
      confirmedProbability: probability[own] as number,
    });
  }
  return found.sort(
    (a, b) => a.confirmedProbability - b.confirmedProbability || (a.message < b.message ? -1 : 1),
  );
}
