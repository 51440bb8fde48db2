import type { IntakeSettings } from './intake-settings.ts';

/** The desk's file, validated: queues, slots, guards, own addresses, costs. Values only. */

export interface Queue {
  /** ASCII, [a-z0-9][a-z0-9-]{0,62}: it is written into object metadata. */
  readonly id: string;
  readonly title: string;
  /** Staff minutes lost when a message of another queue is routed here; defaults to costs.wrongRouteMinutes. */
  readonly wrongRouteMinutes: number;
}

export interface Costs {
  /** Staff minutes for a person's look at a held message. */
  readonly lookMinutes: number;
  readonly wrongRouteMinutes: number;
}

/** A pattern of fixed shape, matched in linear time: `#` one digit, `@` one letter, all else literal, e.g. `FW-########`. */
export interface ReferencePattern {
  readonly id: string;
  readonly pattern: string;
}

export interface ClosedField {
  readonly form: string;
  readonly field: string;
  readonly values: readonly string[];
}

export interface Guard {
  readonly id: string;
  readonly queue: string;
  /** Any of these phrases in the subject or the writer's own text; compared by words, NFKC and case folded. */
  readonly phrases: readonly string[];
  /** Sender addresses or `@domain` suffixes. */
  readonly senders: readonly string[];
  readonly fields: readonly ClosedField[];
}

export interface Desk {
  readonly version: 1;
  readonly name: string;
  /** IANA zone for day and hour bands. */
  readonly timeZone: string;
  readonly ownAddresses: readonly string[];
  readonly ownDomains: readonly string[];
  readonly queues: readonly Queue[];
  readonly costs: Costs;
  readonly senderClasses: readonly { readonly id: string; readonly domains: readonly string[] }[];
  readonly references: readonly ReferencePattern[];
  readonly forms: readonly string[];
  readonly fields: readonly ClosedField[];
  /** In order; the first that matches acts. */
  readonly guards: readonly Guard[];
  /** Share of routed messages marked for a person's look, 0 to 1. */
  readonly auditShare: number;
  /** Counts lose half their weight in this many days; null: never. */
  readonly halfLifeDays: number | null;
  /** Forms and confirmations over HTTPS; absent: none are taken. */
  readonly intake?: IntakeSettings;
}
