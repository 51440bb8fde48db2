import { Buffer } from 'node:buffer';
import { parseMail } from '../../src/message/mail.ts';
import type { Message } from '../../src/message/message.ts';

/** Mail as it goes over the wire: lines joined by CRLF, the first line break of a template literal dropped. */
export function wire(source: string): Buffer {
  return Buffer.from(source.replace(/^\n/, '').replace(/\r?\n/g, '\r\n'));
}

/** A message of one text/plain part in UTF-8. */
export function plainMail(body: string, header = ''): Buffer {
  return wire(
    `From: Anna Berg <anna@berg.example>\nTo: help@fenmarkwater.example\nSubject: Question\n${header}MIME-Version: 1.0\nContent-Type: text/plain; charset=utf-8\n\n${body}`,
  );
}

/** A message of one text/html part in UTF-8. */
export function htmlMail(html: string): Buffer {
  return wire(
    `From: Anna Berg <anna@berg.example>\nTo: help@fenmarkwater.example\nSubject: Question\nMIME-Version: 1.0\nContent-Type: text/html; charset=utf-8\n\n${html}`,
  );
}

export function parseWire(source: string): Promise<Message> {
  return parseMail(wire(source));
}

export function codesOf(message: Message): string[] {
  return message.defects.map(({ code }) => code);
}

/** The same bytes in pieces of `size`. */
export async function* inPieces(bytes: Uint8Array, size: number): AsyncGenerator<Uint8Array> {
  for (let at = 0; at < bytes.length; at += size) yield bytes.subarray(at, at + size);
}
