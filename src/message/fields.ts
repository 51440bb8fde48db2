import { Buffer } from 'node:buffer';
import libmime from 'libmime';
import { decode as decodeCharset } from 'libmime/lib/charset.js';
import { bounds } from '../bounds.ts';
import { cleanLine, cutText } from './clean-text.ts';
import type { Defects } from './defects.ts';
import type { Field } from './header-gate.ts';

/** The kept header fields of a message by name. */
export class Fields {
  readonly #fields: readonly Field[];

  constructor(fields: readonly Field[]) {
    this.#fields = fields;
  }

  has(name: string): boolean {
    return this.#fields.some((field) => field.name === name);
  }

  /** Value of the first field of that name, one character a byte; empty when there is none. */
  first(name: string): string {
    return this.#fields.find((field) => field.name === name)?.value ?? '';
  }

  all(name: string): readonly string[] {
    return this.#fields.filter((field) => field.name === name).map((field) => field.value);
  }
}

/** Bytes of a header value to text: UTF-8 (RFC 6532) or, when it is none, Windows-1252. */
export function fieldText(value: string): string {
  if (!/[\x80-\xff]/.test(value)) return value;
  const bytes = Buffer.from(value, 'latin1');
  const utf8 = bytes.toString('utf8');
  return utf8.includes('\ufffd') ? decodeCharset(bytes, 'windows-1252') : utf8;
}

const encodedWord = /=\?([^?\s]{1,60})\?[bq]\?[^?]*\?=/i;

/** Unstructured text of a header (RFC 5322 section 3.2.5) with its encoded words decoded (RFC 2047), bounded. */
export function readUnstructured(value: string, place: string, defects: Defects): string {
  let text = value;
  if (text.length > bounds.subjectBytesMax) {
    defects.add('subject-cut', place);
    // At white space, so that no encoded word is cut in two.
    text = text.slice(0, bounds.subjectBytesMax).replace(/\s\S*$/, '');
  }
  text = fieldText(text);
  if (text.includes('=?')) {
    try {
      text = libmime.decodeWords(text);
    } catch {
      defects.add('charset-unknown', place);
    }
  }
  if (text.includes('\ufffd')) {
    defects.add('charset-damaged', place);
    text = text.replaceAll('\ufffd', '');
  }
  const line = cleanLine(text, place, defects);
  if (line.length <= bounds.subjectCharsMax) return line;
  defects.add('subject-cut', place);
  return cutText(line, bounds.subjectCharsMax);
}

/** Charset of the first encoded word: what the sender's program writes in, a hint for bodies that declare none. */
export function hintCharsetOf(value: string): string {
  return encodedWord.exec(value)?.[1]?.split('*', 1)[0] ?? '';
}
