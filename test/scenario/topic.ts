export const queueIds = [
  'billing',
  'meter-readings',
  'moving-home',
  'leaks-and-bursts',
  'water-quality',
  'sewer-flooding',
  'new-connections',
  'complaints',
  'careers',
  'suppliers',
] as const;
export type QueueId = (typeof queueIds)[number];

/** What somebody writes about. Every list holds templates for `writeSentence`. */
export interface Topic {
  readonly id: string;
  /** Where letters on this topic belong; more than one where even the staff disagree. Weights. */
  readonly queues: Readonly<Partial<Record<QueueId, number>>>;
  /** Relative frequency within the language. */
  readonly weight: number;
  readonly subjects: readonly string[];
  /** One of these is always there. */
  readonly core: readonly string[];
  /** None to three of these. */
  readonly more: readonly string[];
}

/** Sentences that any letter may hold; they tell little or nothing about its queue. */
export interface SharedLanguage {
  readonly subjects: readonly string[];
  readonly greetings: readonly string[];
  readonly openers: readonly string[];
  readonly context: readonly string[];
  readonly chatter: readonly string[];
  readonly asks: readonly string[];
  readonly asides: readonly string[];
  readonly closings: readonly string[];
  /** Whole letters of a line or two. */
  readonly short: readonly string[];
  readonly forwards: readonly string[];
  readonly attribution: string;
  readonly forwardRule: string;
  readonly sentFrom: readonly string[];
}
