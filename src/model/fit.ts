import type { Schema } from '../features/schema.ts';

/** One addend of the log posterior and how much it counts. Blocks are data: what is scored is what is listed here. */
export interface Block {
  /** `prior`, `slots` or `tokens`. */
  readonly kind: 'prior' | 'slots' | 'tokens';
  /** Slot group or region id; empty for the prior. */
  readonly place: string;
  /** For tokens: what a draw is. share: a token of the queue; presence: a message of the queue. */
  readonly reading: 'share' | 'presence' | null;
  /** For tokens: prior concentrations s averaged over by their evidence, beside the pooled rate. */
  readonly concentrations: readonly number[];
  /** For tokens: which contributions are summed: all, those for a queue (above 0) or those against it (below 0). */
  readonly side: 'all' | 'for' | 'against';
  /** Non-negative; multiplies the block's score. */
  readonly exponent: number;
  /** Exponents of single queues that differ from `exponent`. */
  readonly byQueue: Readonly<Record<string, number>>;
}

/** Everything fitted from the counts: small, and kept beside them in the served table. */
export interface Fit {
  readonly version: 1;
  readonly blocks: readonly Block[];
  /** Addend of single queues' log posterior, nats. */
  readonly bias: Readonly<Record<string, number>>;
  /** Prior pseudo-count of each queue (α) and of each value of a slot (β by slot id). */
  readonly alpha: number;
  readonly beta: Readonly<Record<string, number>>;
  /** Mean leave-one-out log loss in nats of the sample that was fitted; null for defaults. */
  readonly logLoss: number | null;
  /** Messages in that sample. */
  readonly messages: number;
}

/** Where nothing is fitted yet. */
export function defaultFit(schema: Schema): Fit {
  const groups = [...new Set(schema.slots.map((s) => s.group))];
  const tokens = schema.regions.flatMap(({ id }) => [
    tokenBlock(id, 'share', [100], 0.25),
    tokenBlock(id, 'presence', [1], 0.15),
  ]);
  return {
    version: 1,
    blocks: [
      { kind: 'prior', place: '', reading: null, concentrations: [], side: 'all', exponent: 1, byQueue: {} },
      ...groups.map(
        (place): Block => ({
          kind: 'slots',
          place,
          reading: null,
          concentrations: [],
          side: 'all',
          exponent: 0.5,
          byQueue: {},
        }),
      ),
      ...tokens,
    ],
    bias: {},
    alpha: 1,
    beta: Object.fromEntries(schema.slots.map((s) => [s.id, 1])),
    logLoss: null,
    messages: 0,
  };
}

export function tokenBlock(
  place: string,
  reading: 'share' | 'presence',
  concentrations: number[],
  exponent: number,
): Block {
  return { kind: 'tokens', place, reading, concentrations, side: 'all', exponent, byQueue: {} };
}
