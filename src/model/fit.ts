import type { Schema } from '../features/schema.ts';

/** One addend of the log posterior and how much it counts. Blocks are data: what is scored is what is listed. */
export type Block = PriorBlock | SlotsBlock | TokensBlock;

/** An exponent w ≥ 0 multiplies the block's score; single queues may have one of their own. */
interface Weighted {
  readonly exponent: number;
  readonly byQueue: Readonly<Record<string, number>>;
}

/** log P(queue) from the confirmed messages. */
export interface PriorBlock extends Weighted {
  readonly kind: 'prior';
}

/** The slots of one group. */
export interface SlotsBlock extends Weighted {
  readonly kind: 'slots';
  readonly group: string;
  /** Centre of the prior of each slot's values: `pooled` as all queues hold them, else evenly over the list. */
  readonly base?: 'pooled';
}

/** One reading of one region's tokens, or a part of it. */
export interface TokensBlock extends Weighted, Reading {
  readonly kind: 'tokens';
  /** Contributions summed: all; of present tokens those for a queue (above 0) or against it (below 0); of absent tokens. */
  readonly part: 'all' | 'for' | 'against' | 'absent';
}

/** How a region's counts are turned into rates. */
export interface Reading {
  readonly region: string;
  /** What a draw is: a token of the queue's messages, or a message of the queue. */
  readonly draws: 'tokens' | 'messages';
  /** Concentrations s of the Beta priors averaged over, each weighted by its evidence; ascending. */
  readonly concentrations: readonly number[];
  /** The model without dependence on the queue: one rate that is known (`fixed` at the pooled one), or one rate with the same
   *  prior (`unknown`; a single concentration only). */
  readonly pooledRate: 'fixed' | 'unknown';
}

/** Which tokens a served table holds. */
export interface Hold {
  /** Confirmed messages that hold the token, at least; by region id. */
  readonly seenMin: Readonly<Record<string, number>>;
  /** Posterior probability that its rate depends on the queue, at least. */
  readonly relevanceMin: number;
  /** A token that fails stays while it is new: seen within the last `newTokenEpochs`. */
  readonly sparesNew: boolean;
}

/** How stated posteriors are corrected so that they come true. */
export interface Reliability {
  /** Corrected log odds of the largest posterior at the middle of each band of the record; null: nothing to correct. */
  readonly logOdds: readonly number[] | null;
  /** The record when this was learned, cell by cell: what was said since was said with this correction. Empty at first. */
  readonly since: readonly number[];
  /** Messages of the fit under which the record begins; absent before the first fit. */
  readonly fitted?: number;
}

/** Everything fitted from the counts: small, kept beside them in the served table. */
export interface Fit {
  readonly version: 1;
  readonly blocks: readonly Block[];
  /** Addend to single queues' log posterior, nats. */
  readonly bias: Readonly<Record<string, number>>;
  /** Pseudo-count of each queue. */
  readonly alpha: number;
  /** Pseudo-count of a value, on average over the slot's list, by slot id. */
  readonly beta: Readonly<Record<string, number>>;
  /** Chosen for the table's size; the exponents were fitted without the tokens that fail it. */
  readonly hold: Hold;
  readonly reliability: Reliability;
  /** Mean leave-one-out log loss of the fitted sample, nats; null where nothing was fitted. */
  readonly logLoss: number | null;
  /** Messages in that sample. */
  readonly messages: number;
}

/** Concentrations from a prior that a few draws overrule to one that thousands do not: the evidence of each token's own
 *  counts chooses among them, so that none is tuned. A grid twice as fine changed log loss by less than 0.01. */
const concentrations = { tokens: [3, 30, 300, 3000], messages: [0.3, 3, 30, 300] } as const;

/** Exponents that served short forms, mail, lists, descriptions, essays and the demo at every size from 5 to 1,600 learned
 *  messages: [tokens for, tokens against, messages for, messages against]. */
const regionDefaults: Readonly<Record<string, readonly number[]>> = {
  subject: [0.6, 0.15, 0.4, 0.1],
  word: [0.65, 0.7, 0.3, 0.35],
  pair: [0.3, 0.15, 0.05, 0.1],
  gram: [0.6, 0.45, 0.1, 0.2],
};

/** What is used until there is enough to fit: for every region both readings, what speaks for a queue apart from what speaks
 *  against it. Absent tokens are left out: with them log loss falls by 0.003 on short forms and by nothing on long mail, and
 *  every table would have to be summed over on load. */
export function defaultFit(schema: Schema): Fit {
  const groups = [...new Set(schema.slots.map((slot) => slot.group))];
  return {
    version: 1,
    blocks: [
      { kind: 'prior', exponent: 0.5, byQueue: {} },
      ...groups.map(
        (group): SlotsBlock => ({
          kind: 'slots',
          group,
          base: 'pooled',
          exponent: 0.35,
          byQueue: {},
        }),
      ),
      ...schema.regions.flatMap(({ id }) => {
        const [tokensFor, tokensAgainst, messagesFor, messagesAgainst] = regionDefaults[id] ?? [
          0.5, 0.4, 0.3, 0.25,
        ];
        return [
          tokens(id, 'tokens', 'for', tokensFor),
          tokens(id, 'tokens', 'against', tokensAgainst),
          tokens(id, 'messages', 'for', messagesFor),
          tokens(id, 'messages', 'against', messagesAgainst),
        ];
      }),
    ],
    bias: {},
    alpha: 1,
    beta: Object.fromEntries(schema.slots.map((slot) => [slot.id, 1])),
    hold: { seenMin: {}, relevanceMin: 0, sparesNew: true },
    reliability: { logOdds: null, since: [] },
    logLoss: null,
    messages: 0,
  };
}

function tokens(
  region: string,
  draws: Reading['draws'],
  part: TokensBlock['part'],
  exponent: number,
): TokensBlock {
  const reading: Reading = { region, draws, concentrations: concentrations[draws], pooledRate: 'fixed' };
  return { kind: 'tokens', ...reading, part, exponent, byQueue: {} };
}

/** A block's exponent for a queue. */
export function exponentOf(block: Block, queue: string): number {
  return block.byQueue[queue] ?? block.exponent;
}

/** Whether a block moves no queue's posterior. */
export function isIdle(block: Block): boolean {
  return block.exponent === 0 && Object.values(block.byQueue).every((exponent) => exponent === 0);
}
