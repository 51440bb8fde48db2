import type { Claim } from '../../src/ledger/world.ts';
import { claim, seeded } from '../ledger/fixture.ts';

const queues = ['billing', 'leaks', 'meters', 'moving'];

export interface Deliveries {
  /** Every claim at least once, out of order. */
  readonly claims: readonly Claim[];
  readonly messages: readonly string[];
  /** Queue of the newest confirmation of each message. */
  readonly expected: Readonly<Record<string, string>>;
}

/** First confirmations, later corrections of some of them, and repeated deliveries, shuffled. */
export function makeDeliveries(
  seed: number,
  count: { readonly messages: number; readonly corrections: number; readonly repeats: number },
): Deliveries {
  const random = seeded(seed);
  const pick = (below: number): number => Math.floor(random() * below);
  const messages = Array.from({ length: count.messages }, (_, i) => `m${i}`);
  const expected: Record<string, string> = {};
  const claims: Claim[] = [];
  const confirm = (message: string): void => {
    const queue = queues[pick(queues.length)];
    // Every confirmation has a minute of its own, so that the newest is known.
    claims.push(claim(message, queue, claims.length, `person${pick(9)}`));
    expected[message] = queue;
  };
  for (const message of messages) confirm(message);
  for (let i = 0; i < count.corrections; i++) confirm(messages[pick(messages.length)]);
  const distinct = claims.length;
  for (let i = 0; i < count.repeats; i++) claims.push(claims[pick(distinct)]);
  for (let i = claims.length - 1; i > 0; i--) {
    const j = pick(i + 1);
    [claims[i], claims[j]] = [claims[j], claims[i]];
  }
  return { claims, messages, expected };
}

/** What a stored message of this name holds: 15 to 20 KB, more than one write of the system takes at once. */
export const bodyOf = (message: string): Uint8Array =>
  new TextEncoder().encode(`Subject: ${message}\r\n\r\n${message} `.repeat(700));
