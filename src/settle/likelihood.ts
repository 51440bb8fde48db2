import type { Desk } from '../desk/desk.ts';
import { type Balance, weighEvidence } from '../explain/balance.ts';
import type { Extractor } from '../features/extractor.ts';
import type { Features } from '../features/schema.ts';
import type { LoadedModel } from '../ledger/load-model.ts';
import type { Message } from '../message/message.ts';
import { epochAt } from '../model/fold.ts';
import { explainParts, posteriorOf } from '../model/posterior-of.ts';
import { createScorer } from '../model/scorer.ts';

/** Desk and model as last committed. */
export interface Bench {
  readonly desk: Desk;
  readonly extractor: Extractor;
  readonly model: LoadedModel;
}

export interface Likely {
  readonly queue: string;
  readonly title: string;
  readonly probability: number;
}

/** How likely each open queue is now, likeliest first, and what speaks for the first against the second and the third. */
export interface Likelihood {
  readonly queues: readonly Likely[];
  readonly balances: readonly Balance[];
}

export function weighMessage({ desk, extractor, model }: Bench, message: Message): Likelihood {
  const features = extractor.extract(message);
  const posterior = posteriorOf(model.scorer, features);
  const queues = posterior.queues
    .map((queue, k) => ({ queue, title: titleIn(desk, queue), probability: posterior.probability[k]! }))
    .sort((a, b) => b.probability - a.probability);
  if (model.isEmpty || queues.length < 2) return { queues, balances: [] };
  const parts = explainParts(model.scorer, features);
  const words = extractor.words(message);
  const [first, ...rivals] = queues.slice(0, 3).map(({ queue }) => queue) as [string, ...string[]];
  return {
    queues,
    balances: rivals.map((rival) => weighEvidence(parts, posterior.queues, first, rival, words)),
  };
}

export interface Learned {
  readonly before: number;
  readonly after: number;
}

/** The probability of the queue for this message, and the same with this one confirmation counted. */
export function whatItTeaches(
  { extractor, model, desk }: Bench,
  message: Message,
  queue: string,
  atMs: number,
): Learned {
  const features = extractor.extract(message);
  const { scorer, parts } = model;
  const before = probabilityIn(scorer, features, queue);
  const plus = { queue, epoch: epochAt(atMs) };
  const overlay = [...[...parts.segments.values()].flat(), { features, said: null, minus: null, plus }];
  const queues = desk.queues.map(({ id }) => id);
  const taught = createScorer(parts.table.value, overlay, queues, parts.table.value.halfLifeDays);
  return { before, after: probabilityIn(taught, features, queue) };
}

function probabilityIn(scorer: Parameters<typeof posteriorOf>[0], features: Features, queue: string): number {
  const posterior = posteriorOf(scorer, features);
  return posterior.probability[posterior.queues.indexOf(queue)] ?? 0;
}

export function titleIn(desk: Desk, queue: string): string {
  return desk.queues.find(({ id }) => id === queue)?.title ?? queue;
}
