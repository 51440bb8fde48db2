import type { Fault } from '../errors.ts';
import type { Features } from '../features/schema.ts';
import type { Said } from '../model/counts.ts';
import type { Store } from '../store/store.ts';

/** Everything outside of the program that the ledger touches. */
export interface World {
  readonly store: Store;
  /** Milliseconds since 1970 UTC. Only courtesy and deadlines depend on it, never exactness. */
  readonly nowMs: () => number;
  /** Uniform in [0, 1): ids and jitter. */
  readonly random: () => number;
  readonly sleep: (ms: number) => Promise<void>;
}

/** What a person or an import said: this message belongs to this queue. */
export interface Confirmation {
  /** Key of the raw message without `inbound/`. */
  readonly message: string;
  readonly queue: string;
  readonly by: string;
  /** ISO 8601 time; the newest one of a message stands, whatever the order of delivery. */
  readonly at: string;
}

export interface Claim {
  readonly confirmation: Confirmation;
  readonly features: Features;
  readonly said: Said | null;
}

/** What became of a claim. Its delivery is done with for every kind but `retry`. */
export type FoldOutcome =
  /** Now in the counts. */
  | { readonly kind: 'folded' }
  /** Was in the counts before, or was taken back since: a repeated delivery. */
  | { readonly kind: 'already' }
  /** A newer confirmation of the message stands; kept in its history only. */
  | { readonly kind: 'stale' }
  | { readonly kind: 'refused'; readonly fault: Fault }
  /** Not known to be in the counts: keep the drop and deliver it again. */
  | { readonly kind: 'retry'; readonly fault: Fault };
