import { signTicket, ticketKeyOf } from './ticket.ts';

export interface LinkWanted {
  /** The page's address; only its origin matters. */
  readonly url: URL;
  readonly by: string;
  readonly untilMs: number;
  /** Makes the link one of its own: it works once. Letters and digits. */
  readonly number: string;
}

/** Where one person comes in to the deployed page, once and until a time. */
export function linkTo(secret: Uint8Array, { url, by, untilMs, number }: LinkWanted): string {
  const key = ticketKeyOf(secret, url.origin);
  return `${url.origin}/enter?t=${signTicket(key, { purpose: 'enter', by, untilMs, about: number })}`;
}
