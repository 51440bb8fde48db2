import type { Features } from '../features/schema.ts';
import type { CountsView } from './counts.ts';
import type { Block, Fit } from './fit.ts';
import { fitQueues, fitShared, type LabelledScores, meanLoss, type Shrinkage } from './fit-exponents.ts';
import type { Own } from './hits.ts';
import { type OwnMessage, scoreLeavingOut } from './leave-one-out.ts';
import { normalise } from './posterior-of.ts';
import { fitPriors } from './priors.ts';
import { type Projection, projectionOf, vocabularyOf, weightOf } from './projection.ts';
import { chooseHold, holdAll } from './prune.ts';
import { learnReliability, renewReliability } from './reliability.ts';
import { rowCount } from './rows.ts';
import { createScorer } from './scorer.ts';
import { type ServedTable, serveTokens } from './served-table.ts';

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

/** A confirmation that all other messages contradict. */
export interface Contradiction {
  /** Place in the sample. */
  readonly index: number;
  /** Leave-one-out posterior of the queue confirmed, and the likeliest queue with its. */
  readonly probability: number;
  readonly likelier: string;
  readonly likelierProbability: number;
}

export interface FitFindings {
  readonly fit: Fit;
  /** Least likely first. */
  readonly contradictions: readonly Contradiction[];
}

/** A confirmed queue less likely than this by all other messages is worth a second look. */
const contradictedBelow = 0.01;

/** All that is fitted from the counts, see `fitFindings`. */
export function fitTable(
  counts: CountsView,
  sample: readonly FoldedMessage[],
  previousFit: Fit,
  options: FitOptions = { halfLifeDays: null },
): Fit {
  return fitFindings(counts, sample, previousFit, options).fit;
}

/** Pseudo-counts by the evidence; the correction of stated posteriors by the record; exponents that minimise the log loss of
 *  leave-one-out scores, first shared by all queues and shrunk towards the last fit, then by queue, shrunk towards the shared
 *  ones. Every message of the sample must stand in the counts; at most `fitMessagesMax` are used (fewer of many queues, see
 *  `fitScoresMax`), evenly spread over the sample's order. Deterministic.
 *  Cost: O(messages · queues · (tokens + blocks²)). */
export function fitFindings(
  counts: CountsView,
  sample: readonly FoldedMessage[],
  previousFit: Fit,
  { halfLifeDays }: FitOptions,
): FitFindings {
  const projection = projectionOf(counts, halfLifeDays);
  const { head, referenceEpoch } = projection;
  const vocabulary = vocabularyOf(counts, projection);
  const hold = chooseHold(counts, projection, vocabulary, previousFit);
  const reliability = learnReliability(counts.record, previousFit.reliability);
  const basis: Fit = { ...previousFit, ...fitPriors(head), hold, reliability };
  const queues = head.columns.map((c) => c.queue);
  const messages = sample
    .map(({ features, queue, epoch }, index): OwnMessage => {
      return {
        index,
        features,
        queue: queues.indexOf(queue),
        weight: weightOf(epoch, referenceEpoch, halfLifeDays),
      };
    })
    .filter(({ queue, weight }) => queue >= 0 && weight > 0);
  if (messages.length === 0 || queues.length < 2) return { fit: basis, contradictions: [] };

  const table = tableFor(counts, projection, vocabulary, messages, { ...basis, hold: holdAll }, halfLifeDays);
  const seenMin = hold.sparesNew ? {} : hold.seenMin;
  const scorer = createScorer(table, [], queues, halfLifeDays, { isForFit: true, seenMin });
  const { active, own, scores } = scoreLeavingOut(scorer, messages);
  const before = Float64Array.from(active, (b) => basis.blocks[b].exponent);
  const shared = fitShared(scores, before, shrinkage);
  const byQueue = fitQueues(scores, shared, shrinkage);
  const blocks = basis.blocks.map((block, b): Block => {
    const at = active.indexOf(b);
    if (at < 0) return { ...block, byQueue: {} };
    const exponent = rounded(shared[at]);
    const differing = queues.map(
      (queue, k) => [queue, rounded(byQueue.exponents[k * active.length + at])] as const,
    );
    return { ...block, exponent, byQueue: Object.fromEntries(differing.filter(([, w]) => w !== exponent)) };
  });
  const bias = Object.fromEntries(queues.map((queue, k) => [queue, rounded(byQueue.bias[k])]));
  const fit: Fit = {
    ...basis,
    blocks,
    bias,
    reliability: renewReliability(counts.record, previousFit.reliability, own.length),
    logLoss: meanLoss(scores, byQueue.logs),
    messages: own.length,
  };
  // With nothing else in the queue, nothing else can say that a message does not belong there.
  const isAlone = ({ queue, weight }: Own) => head.messages[queue] - weight < 1;
  return { fit, contradictions: contradict(scores, byQueue.logs, queues, own, isAlone) };
}

/** A table that scores the messages as the whole one would: of a large base only with their own tokens. */
function tableFor(
  counts: CountsView,
  projection: Projection,
  vocabulary: readonly number[],
  messages: readonly OwnMessage[],
  fit: Fit,
  halfLifeDays: number | null,
): ServedTable {
  const countsAbsent = fit.blocks.some(
    (b) => b.kind === 'tokens' && b.draws === 'messages' && (b.part === 'all' || b.part === 'absent'),
  );
  const wanted = counts.regions.map((region, g) => {
    const length = messages.reduce((sum, { features }) => sum + features.regions[g].length, 0);
    return countsAbsent || length >= rowCount(region) ? null : tokensOf(messages, g, length);
  });
  return serveTokens(counts, projection, vocabulary, wanted, fit, halfLifeDays);
}

/** Tokens of a region in any of the messages, `length` with repetitions; ascending. */
function tokensOf(messages: readonly OwnMessage[], g: number, length: number): Float64Array {
  const tokens = new Float64Array(length);
  let at = 0;
  for (const { features } of messages) {
    tokens.set(features.regions[g], at);
    at += features.regions[g].length;
  }
  return tokens.sort();
}

function contradict(
  { queues: width, truth }: LabelledScores,
  logs: Float64Array,
  queues: readonly string[],
  own: readonly OwnMessage[],
  isAlone: (own: Own) => boolean,
): Contradiction[] {
  return own
    .flatMap((message, i): Contradiction[] => {
      const p = normalise(logs.subarray(i * width, (i + 1) * width)).map(Math.exp);
      if (p[truth[i]] >= contradictedBelow || isAlone(message)) return [];
      const top = p.indexOf(Math.max(...p));
      return [
        {
          index: message.index,
          probability: p[truth[i]],
          likelier: queues[top],
          likelierProbability: p[top],
        },
      ];
    })
    .sort((a, b) => a.probability - b.probability || a.index - b.index);
}

/** Four decimals move no posterior that is written, and keep the table small. */
function rounded(exponent: number): number {
  return Math.round(exponent * 1e4) / 1e4;
}
