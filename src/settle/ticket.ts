import { createHmac, hkdfSync, timingSafeEqual } from 'node:crypto';

/** Signed statements about one person, for links, cookies and forms. HMAC-SHA256 (RFC 2104) under a key that HKDF (RFC 5869)
 *  derives from the desk's secret, so that no password is stored anywhere and a token of one purpose serves no other. */

export type TicketPurpose = 'enter' | 'session' | 'act';

export interface Ticket {
  readonly purpose: TicketPurpose;
  /** The person's name, as it will stand in confirmations. */
  readonly by: string;
  readonly untilMs: number;
  /** For `enter`: a number that makes it unique. For `act`: such a number, and what it lets do with which message. */
  readonly about: string;
}

export type ReadTicket =
  | { readonly kind: 'valid'; readonly ticket: Ticket }
  | { readonly kind: 'refused'; readonly why: 'altered' | 'expired' };

export type TicketKey = Uint8Array;

const charsMax = 4096;

/** `place`: the origin that tickets are for, so that a link to one desk's page opens no other, whatever secret they share. */
export function ticketKeyOf(secret: Uint8Array, place = ''): TicketKey {
  const info = `tallypost settle tickets 1 ${place}`.trimEnd();
  return new Uint8Array(hkdfSync('sha256', secret, new Uint8Array(0), info, 32));
}

/** Under which a ticket is marked as used; its time stands first, so that stale marks are known by their names. */
export function usedMark({ untilMs, about }: Pick<Ticket, 'untilMs' | 'about'>): string {
  return `${untilMs.toString(36)}-${about.split(' ', 1)[0]}`;
}

/** `<base64url of JSON>.<base64url of its code>`; safe in a URL. */
export function signTicket(key: TicketKey, ticket: Ticket): string {
  const { purpose, by, untilMs, about } = ticket;
  const body = Buffer.from(JSON.stringify([purpose, by, untilMs, about])).toString('base64url');
  return `${body}.${codeOf(key, body).toString('base64url')}`;
}

/** Whether the text is a ticket of this purpose that is still good. */
export function readTicket(key: TicketKey, purpose: TicketPurpose, text: string, nowMs: number): ReadTicket {
  const altered = { kind: 'refused', why: 'altered' } as const;
  if (text.length > charsMax) return altered;
  const [body, code, ...rest] = text.split('.') as [string, string | undefined];
  if (code === undefined || rest.length > 0) return altered;
  const given = Buffer.from(code, 'base64url');
  const expected = codeOf(key, body);
  // Compared as texts too: base64url decoders overlook stray bits in the last letter.
  if (given.length !== expected.length || !timingSafeEqual(given, expected)) return altered;
  if (code !== expected.toString('base64url')) return altered;
  const ticket = contentOf(body);
  if (ticket === null || ticket.purpose !== purpose) return altered;
  return ticket.untilMs < nowMs ? { kind: 'refused', why: 'expired' } : { kind: 'valid', ticket };
}

function codeOf(key: TicketKey, body: string): Buffer {
  return createHmac('sha256', key).update(body).digest();
}

function contentOf(body: string): Ticket | null {
  const [purpose, by, untilMs, about] = JSON.parse(Buffer.from(body, 'base64url').toString('utf8')) as [
    TicketPurpose,
    string,
    number,
    string,
  ];
  return typeof by === 'string' && typeof untilMs === 'number' && typeof about === 'string'
    ? { purpose, by, untilMs, about }
    : null;
}
