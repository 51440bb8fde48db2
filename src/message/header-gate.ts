import { Buffer } from 'node:buffer';
import { bounds } from '../bounds.ts';
import type { Defects } from './defects.ts';

/** A header field as received, unfolded; the value holds one character a byte. */
export interface Field {
  /** Lower-cased. */
  readonly name: string;
  readonly value: string;
}

/** The fields that routing looks at and how many of each are kept; all others are only walked over. */
const keptFieldsMax: Readonly<Record<string, number>> = {
  'content-type': 1,
  'content-transfer-encoding': 1,
  'content-disposition': 1,
  from: 1,
  sender: 1,
  to: 20,
  cc: 20,
  'delivered-to': 20,
  subject: 1,
  date: 1,
  'message-id': 1,
  'in-reply-to': 1,
  references: 1,
  'auto-submitted': 1,
  'return-path': 1,
  'list-id': 1,
  'x-ses-spam-verdict': 1,
  'x-ses-virus-verdict': 1,
};

/** RFC 5322 section 3.6: these stand at most once. */
const singleFields = new Set(['from', 'sender', 'subject', 'date', 'message-id', 'content-type']);

/** RFC 5322 section 3.6.8 (printable ASCII but the colon) with the white space that section 4.5 allows before the
 *  colon; bytes above ASCII are let through, because RFC 6532 mail and broken mailers use them. */
const fieldLine = /^([!-9;-~\x80-\xff]{1,76})[ \t]*:/;

/** Names that make a line after an unreadable one surely a header still. */
const knownName =
  /^(?:content-|mime-version|from|to|cc|subject|date|received|message-id|reply-to|return-path|x-|list-|dkim-|arc-|authentication-|in-reply-to|references|sender|delivered-to|auto-submitted|importance|precedence)/i;

const lf = 0x0a;

/** Lines in the header of a part that are neither fields nor continue one: text whose blank line before it is missing. */
export function strayLines(header: Buffer): Buffer {
  const stray: string[] = [];
  let isInField = false;
  for (const line of header.toString('latin1').split('\n')) {
    const content = line.trimEnd();
    if (content === '' || (isInField && /^[ \t]/.test(line))) continue;
    isInField = fieldLine.test(content);
    if (!isInField && !content.startsWith('From ')) stray.push(content);
  }
  return Buffer.from(stray.length === 0 ? '' : `${stray.join('\r\n')}\r\n`, 'latin1');
}

/** Reads the header section of a message piece by piece, however large it is, and keeps the few fields of interest.
 *  Lines are taken as they come, so memory is bounded whatever the input; what follows the header is handed back. */
export class HeaderGate {
  readonly fields: Field[] = [];
  readonly #defects: Defects;
  readonly #counts = new Map<string, number>();
  #pending = '';
  #lineIsCut = false;
  #current: { name: string; parts: string[]; length: number } | null = null;
  #stray: string | null = null;
  #bytesKept = 0;
  #hasFields = false;
  #isDone = false;

  constructor(defects: Defects) {
    this.#defects = defects;
  }

  get isDone(): boolean {
    return this.#isDone;
  }

  /** Takes the next bytes; gives the first bytes of the body once the header has ended, else null. */
  feed(piece: Buffer): Buffer | null {
    let start = 0;
    while (start < piece.length) {
      const end = piece.indexOf(lf, start);
      this.#extendLine(piece.toString('latin1', start, end < 0 ? piece.length : end + 1));
      if (end < 0) return null;
      start = end + 1;
      const body = this.#takeLine();
      if (body !== null) return Buffer.concat([Buffer.from(body, 'latin1'), piece.subarray(start)]);
    }
    return null;
  }

  /** The message ended inside its header: what is left is a last header line or the body. */
  end(): Buffer {
    if (this.#isDone) return Buffer.alloc(0);
    const body = this.#pending === '' ? null : this.#takeLine();
    if (this.#isDone) return Buffer.from(body ?? '', 'latin1');
    const stray = this.#stray ?? '';
    this.#finish();
    return Buffer.from(stray, 'latin1');
  }

  #extendLine(bytes: string): void {
    const room = bounds.headerFieldBytesMax - this.#pending.length;
    if (bytes.length <= room) {
      this.#pending += bytes;
      return;
    }
    this.#pending += bytes.slice(0, Math.max(0, room));
    this.#lineIsCut = true;
  }

  /** Judges one line; gives what belongs to the body when the header has ended with it. */
  #takeLine(): string | null {
    const line = this.#pending;
    const content = line.replace(/[\r\n]+$/, '');
    if (this.#lineIsCut)
      this.#defects.add('header-cut', fieldLine.exec(content)?.[1]?.toLowerCase() ?? 'header');
    this.#pending = '';
    this.#lineIsCut = false;

    if (content === '') return this.#takeBlank();
    const field = fieldLine.exec(content);
    if (this.#stray !== null) {
      if (!field || !knownName.test(content)) return this.#endBefore(this.#stray + line, 'header-missing');
      this.#defects.add('header-line-unreadable', 'header');
      this.#stray = null;
    }
    if (this.#hasFields && /^[ \t]/.test(content)) {
      this.#extendField(content);
      return null;
    }
    if (field) {
      if (
        !this.#hasFields &&
        this.#defects.list.some((d) => d.code === 'blank-lines-first') &&
        !knownName.test(content)
      ) {
        return this.#endBefore(line, 'header-missing');
      }
      this.#openField(field[1]!.toLowerCase(), content.slice(field[0].length));
      return null;
    }
    // The envelope line of a mailbox file (RFC 4155) that someone left in front, also as quoted by some mailers.
    if (/^>?From /.test(content)) return null;
    if (!this.#hasFields) return this.#endBefore(line, 'header-missing');
    this.#stray = line;
    return null;
  }

  #takeBlank(): string | null {
    if (this.#stray !== null) return this.#endBefore(`${this.#stray}\n`, 'header-missing');
    if (!this.#hasFields) {
      this.#defects.add('blank-lines-first', 'header');
      return null;
    }
    this.#finish();
    return '';
  }

  #endBefore(body: string, code: 'header-missing'): string {
    this.#defects.add(code, 'header');
    this.#finish();
    return body;
  }

  #openField(name: string, value: string): void {
    this.#closeField();
    this.#hasFields = true;
    const count = (this.#counts.get(name) ?? 0) + 1;
    const most = Object.hasOwn(keptFieldsMax, name) ? keptFieldsMax[name]! : 0;
    if (name === 'received') {
      this.#counts.set(name, count);
      if (count > bounds.receivedMax) this.#defects.add('loop-suspected', 'received');
    }
    if (most === 0) return;
    this.#counts.set(name, count);
    if (count > most) {
      if (singleFields.has(name)) this.#defects.add('header-repeated', name);
      else if (most > 1) this.#defects.add('header-cut', name);
      return;
    }
    if (this.#bytesKept + value.length > bounds.headerBytesMax) {
      this.#defects.add('header-cut', name);
      return;
    }
    this.#bytesKept += value.length;
    this.#current = { name, parts: [value], length: value.length };
  }

  #extendField(content: string): void {
    const field = this.#current;
    if (field === null) return;
    if (
      field.length + content.length > bounds.headerFieldBytesMax ||
      this.#bytesKept + content.length > bounds.headerBytesMax
    ) {
      this.#defects.add('header-cut', field.name);
      this.#closeField();
      return;
    }
    field.parts.push(content);
    field.length += content.length;
    this.#bytesKept += content.length;
  }

  #closeField(): void {
    if (this.#current === null) return;
    // RFC 5322 section 2.2.3: unfolding removes the line ends and nothing else.
    this.fields.push({ name: this.#current.name, value: this.#current.parts.join('').trim() });
    this.#current = null;
  }

  #finish(): void {
    this.#closeField();
    this.#stray = null;
    this.#isDone = true;
  }
}
