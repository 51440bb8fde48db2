/** The answer of the model for one message. */
export interface Posterior {
  /** Open queues, in the desk's order; [queues]. */
  readonly queues: readonly string[];
  /** log P(queue | x), nats; exp sums to 1 ± 1e-12; [queues]. */
  readonly logProb: Float64Array;
  /** exp(logProb), after correction by the reliability record where there is one; sums to 1; [queues]. */
  readonly probability: Float64Array;
  /** Distinct tokens of the message, and how many of them the table holds. */
  readonly tokens: number;
  readonly knownTokens: number;
}

/** One addend of the log posterior, before normalisation, already multiplied by its exponent. */
export interface EvidencePart {
  /** `prior`, `slot`, `token`, `absent` or `length`. */
  readonly kind: string;
  /** Slot id or region id; empty for the prior. */
  readonly place: string;
  /** Value of the slot, or the token's hash in hex; the caller recovers words from the message itself. */
  readonly value: string;
  /** Nats; [queues]. */
  readonly score: Float64Array;
}
