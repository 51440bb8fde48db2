import { Buffer } from 'node:buffer';
import type { DefectCode } from '../../src/message/defects.ts';
import type { Message } from '../../src/message/message.ts';

/** What the whole route makes of an input, whatever the model has learned: held for one of these reasons, or routed or held
 *  as its words say. */
export type ExpectedDecision = 'unreadable' | 'automatic' | 'suspect' | 'by-words';

export interface HostileInput {
  readonly name: string;
  readonly channel: 'mail' | 'form';
  /** Built anew at each call; large ones come as a stream, so that no more than a piece is in memory. */
  build(): Uint8Array | AsyncIterable<Uint8Array>;
  /** Defects that must be on record; others may be. */
  readonly defects: readonly DefectCode[];
  /** Set when no other defect may be on record. */
  readonly isExact?: boolean;
  /** For a message that was read to its end; a source that fails is tried again instead. */
  readonly expectedDecision: ExpectedDecision;
  /** Text that must be found, and text that must not count as the writer's. */
  readonly keeps?: string;
  readonly drops?: string;
  /** Anything else that must hold; gives what is wrong. */
  check?(message: Message): string | null;
}

/** What the customer says in every input that says anything. */
export const plea = 'The meter in Mill Lane shows a wrong reading, please check my bill.';
/** What an attacker wants to be counted. */
export const padding = 'sewer flooding burst urgent emergency';

export const address = 'From: Anna Berg <anna@berg.example>\r\nTo: contact@fenmarkwater.example\r\n';

/** Mail of header lines and a body; strings hold one character a byte. */
export function mail(header: string, body: string): Buffer {
  return Buffer.from(`${header}\r\n${body}`, 'latin1');
}

export function plain(body: string, header = ''): Buffer {
  return mail(
    `${address}Subject: Question\r\n${header}MIME-Version: 1.0\r\nContent-Type: text/plain; charset=utf-8\r\n`,
    Buffer.from(body, 'utf8').toString('latin1'),
  );
}

export function html(body: string): Buffer {
  return mail(
    `${address}Subject: Question\r\nMIME-Version: 1.0\r\nContent-Type: text/html; charset=utf-8\r\n`,
    Buffer.from(body, 'utf8').toString('latin1'),
  );
}

/** A multipart of parts that are given whole, header and body. */
export function multipart(
  type: string,
  parts: readonly string[],
  boundary = 'frontier',
  header = '',
): Buffer {
  const body = parts.map((part) => `--${boundary}\r\n${part}\r\n`).join('');
  return mail(
    `${address}Subject: Question\r\n${header}MIME-Version: 1.0\r\nContent-Type: multipart/${type}; boundary="${boundary}"\r\n`,
    `${body}--${boundary}--\r\n`,
  );
}

export const textPart = (body: string) => `Content-Type: text/plain; charset=utf-8\r\n\r\n${body}`;
export const htmlPart = (body: string) => `Content-Type: text/html; charset=utf-8\r\n\r\n${body}`;

/** `head`, then `piece` again and again up to `bytes` in all, then `tail`; in chunks of about 64 KB. */
export async function* streamOf(
  head: string,
  piece: string,
  bytes: number,
  tail = '',
): AsyncGenerator<Uint8Array> {
  yield Buffer.from(head, 'latin1');
  const chunk = Buffer.from(piece.repeat(Math.max(1, Math.floor((64 * 1024) / piece.length))), 'latin1');
  for (let sent = 0; sent < bytes; sent += chunk.length)
    yield chunk.subarray(0, Math.min(chunk.length, bytes - sent));
  if (tail !== '') yield Buffer.from(tail, 'latin1');
}

/** Repeatable pseudo-random integers below 2^31 (Park and Miller's minimal standard generator). */
export function randomIntegers(seed: number): () => number {
  let state = seed;
  return () => {
    state = Number((BigInt(state) * 48271n) % 2147483647n);
    return state;
  };
}

export function form(data: unknown): Buffer {
  return Buffer.from(JSON.stringify(data), 'utf8');
}
