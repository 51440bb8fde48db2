import type { Fault } from '../../errors.ts';

/** One message of a labelled history, as found. */
export interface Labelled {
  readonly kind: 'item';
  /** The label as written in the history; not yet a queue's id. */
  readonly label: string;
  /** When it was confirmed or sent, ms since the epoch UTC, as the history says; null when it does not. */
  readonly atMs: number | null;
  /** File, and line where there is one. */
  readonly place: string;
  readonly content:
    | { readonly kind: 'mail'; readonly raw: Uint8Array }
    | { readonly kind: 'form'; readonly json: Uint8Array };
}

/** A piece of a history that could not be used; reading goes on after it. */
export interface Unusable {
  readonly kind: 'bad';
  readonly fault: Fault;
}

export type LabelledStream = AsyncGenerator<Labelled | Unusable>;

/** A fault as a stream element. `got` must describe, never quote, what was there: histories hold customers' text. */
export function bad(code: string, place: string, expected: string, got: string): Unusable {
  return { kind: 'bad', fault: { code, place, expected, got } };
}

/** Form JSON as the store's inbound prefix holds it. */
export function formJson(
  id: string,
  fields: Readonly<Record<string, string>>,
  at: string | null,
): Uint8Array {
  return new TextEncoder().encode(
    JSON.stringify(at === null ? { form: id, fields } : { form: id, at, fields }),
  );
}

/** Milliseconds since the epoch from an ISO 8601 text, or from Unix seconds or milliseconds; null when it is none of them. */
export function readTime(value: unknown): number | null {
  if (typeof value === 'number') {
    // Seconds stay below 1e11 until the year 5138; milliseconds passed it in 1973.
    return Number.isFinite(value) && value >= 0 ? (value < 1e11 ? value * 1000 : value) : null;
  }
  if (typeof value !== 'string' || !/^\d{4}-\d\d-\d\d/.test(value)) return null;
  const ms = Date.parse(value);
  return Number.isNaN(ms) ? null : ms;
}
