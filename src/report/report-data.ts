/** Everything the report shows, as plain JSON: the page is made from this and nothing else. Times are ISO 8601 in UTC,
 *  shares and probabilities 0 to 1, evidence in decibans. */
export interface ReportData {
  readonly format: 1;
  readonly desk: string;
  readonly madeAt: string;
  readonly modelVersion: number;
  readonly queues: readonly { readonly id: string; readonly title: string }[];
  readonly costs: { readonly lookMinutes: number; readonly wrongRouteMinutes: number };
  readonly looked: LookedAt;
  readonly waiting: { readonly messages: number; readonly oldestAt: string | null };
  readonly promises: Promises;
  readonly routing: Routing;
  readonly corrections: Corrections;
  readonly volume: Volume;
  readonly drift: readonly Drift[];
  readonly secondLook: readonly SecondLook[];
  readonly newQueues: readonly NewQueue[];
  readonly health: Health;
}

/** Which messages the views on single messages rest on. */
export interface LookedAt {
  readonly messages: number;
  /** All that the store holds, or only the newest of them. */
  readonly isAll: boolean;
  readonly from: string | null;
  readonly to: string | null;
  /** Of them, those that somebody confirmed. */
  readonly confirmed: number;
}

/** Share with its 95 % interval. */
export interface Estimate {
  readonly hits: number;
  readonly of: number;
  /** Null when there are none to tell by. */
  readonly share: number | null;
  readonly low: number;
  readonly high: number;
}

export interface PromiseBand {
  /** Stated probability, from and below. */
  readonly from: number;
  readonly to: number;
  readonly cameTrue: Estimate;
  readonly verdict: 'kept' | 'too-high' | 'too-low' | 'too-few';
}

/** What was said at routing time against what was confirmed. */
export interface Promises {
  readonly bands: readonly PromiseBand[];
  /** Only messages drawn at random for a look: free of the bias of what people happen to check. */
  readonly audit: Estimate;
}

export interface CurvePoint {
  /** Of the judged messages, taken by falling probability. */
  readonly share: number;
  readonly right: number;
  readonly probability: number;
}

export interface Routing {
  /** Confirmed messages that were routed or held with a probability. */
  readonly judged: number;
  readonly curve: readonly CurvePoint[];
  readonly today: { readonly share: number; readonly right: Estimate };
  /** By routing all above a probability: the point that would have cost least. */
  readonly cheapest: { readonly share: number; readonly right: number; readonly probability: number } | null;
  /** Staff minutes for a thousand such messages. */
  readonly minutesPer1000: {
    readonly lookAtEach: number;
    readonly today: number;
    readonly cheapest: number;
  } | null;
}

export interface Correction {
  readonly from: string;
  readonly to: string;
  /** Routed there by itself. */
  readonly routed: number;
  /** Held, with this queue as the likeliest. */
  readonly held: number;
}

export interface Corrections {
  readonly pairs: readonly Correction[];
  readonly routedWrong: number;
  readonly heldWrong: number;
  /** Confirmations that a person changed later. */
  readonly revised: number;
}

export interface VolumeStep {
  readonly from: string;
  readonly routed: number;
  readonly guarded: number;
  readonly held: number;
}

export interface Volume {
  readonly step: 'day' | 'week';
  readonly steps: readonly VolumeStep[];
}

export interface Drift {
  readonly queue: string;
  /** Evidence that the words changed, against one rate throughout. */
  readonly decibans: number;
  readonly recentMessages: number;
  readonly earlierMessages: number;
  readonly since: string;
  /** Words that come more often now; empty when no message that holds them is left. */
  readonly words: readonly string[];
}

export interface SecondLook {
  readonly message: string;
  readonly confirmed: string;
  readonly by: string;
  readonly at: string;
  /** What everything else says, and how likely it thinks the confirmed queue. */
  readonly likelier: string;
  readonly likelierProbability: number;
  readonly confirmedProbability: number;
}

export interface NewQueue {
  readonly messages: readonly string[];
  /** One new queue for all of them against the present queues. */
  readonly decibans: number;
  readonly words: readonly string[];
}

export interface Health {
  readonly faults: readonly string[];
  /** Null: not counted this time. */
  readonly recount: { readonly messages: number; readonly differences: number } | null;
  readonly messages: number;
  readonly cells: number;
  readonly tableBytes: number;
  readonly segments: number;
  /** When the base was made; null before the first compaction. */
  readonly compactedAt: string | null;
  readonly fit: { readonly messages: number; readonly logLoss: number | null };
  /** What counts how much, in words, most first. Exponents. */
  readonly weights: readonly { readonly what: string; readonly exponent: number }[];
}
