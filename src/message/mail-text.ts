import { bounds } from '../bounds.ts';
import { cleanText, cutText } from './clean-text.ts';
import { decodeBody } from './decode-body.ts';
import type { Defects } from './defects.ts';
import { readUnstructured } from './fields.ts';
import { readHtml } from './html-text.ts';
import { isMultipart, isShownText, isTextType, type Part } from './part.ts';
import type { Segment } from './segment-writer.ts';

/** All text of a message in reading order. Embedded messages and other people's headers count as quoted. */
export function readSegments(root: Part, hintCharset: string, defects: Defects): readonly Segment[] {
  const reader: Reader = { hintCharset, defects };
  let segments = textOf(root, false, reader);
  if (!hasText(segments)) {
    const attached = attachedText(root, reader);
    if (hasText(attached)) {
      defects.add('text-in-attachment', 'message');
      segments = attached;
    }
  }
  return boundSegments(segments, defects);
}

interface Reader {
  readonly hintCharset: string;
  readonly defects: Defects;
}

function textOf(part: Part, isQuoted: boolean, reader: Reader): Segment[] {
  if (part.contentType === 'multipart/alternative' && part.children.length > 0) {
    return alternativeText(part, isQuoted, reader);
  }
  if (isMultipart(part)) {
    // A multipart whose parts were not found keeps its body; RFC 2046 section 5.1.5: a digest holds messages.
    if (part.children.length === 0) return bodyText(part, isQuoted, reader);
    const isDigest = part.contentType === 'multipart/digest';
    return part.children.flatMap((child) => textOf(child, isQuoted || isDigest, reader));
  }
  if (part.contentType === 'message/rfc822') {
    return part.children.flatMap((child) => [...subjectOf(child, reader), ...textOf(child, true, reader)]);
  }
  if (!isShownText(part)) return [];
  return bodyText(part, isQuoted || part.contentType === 'text/rfc822-headers', reader);
}

function subjectOf(part: Part, { defects }: Reader): Segment[] {
  if (part.subject === '') return [];
  return [{ text: readUnstructured(part.subject, part.number, defects), isQuoted: true }];
}

/** RFC 2046 section 5.1.4: the same in several forms. Plain text is taken, as it was written by a person or made from
 *  what is seen, unless it is a stub or says something else than the HTML that most people will see. */
function alternativeText(part: Part, isQuoted: boolean, reader: Reader): Segment[] {
  const plain: Segment[] = [];
  const html: Segment[] = [];
  const collect = (child: Part) => {
    if (isMultipart(child)) {
      if (child.contentType === 'multipart/alternative' && child.children.length > 0 && child !== part) {
        html.push(...alternativeText(child, isQuoted, reader));
      } else for (const inner of child.children) collect(inner);
    } else if (child.contentType === 'text/html' && isShownText(child)) {
      html.push(...bodyText(child, isQuoted, reader));
    } else plain.push(...textOf(child, isQuoted, reader));
  };
  for (const child of part.children) collect(child);
  const htmlText = joinSegments(html);
  const plainText = joinSegments(plain);
  if (!hasWords(htmlText)) return plain;
  if (!hasWords(plainText)) return html;
  const isStub = plainText.length * 4 < htmlText.length && plainText.length < 400;
  if (isStub) return html;
  if (sharedShare(plainText, htmlText) >= 0.5) return plain;
  reader.defects.add('alternatives-differ', part.number);
  return html;
}

function bodyText(part: Part, isQuoted: boolean, { hintCharset, defects }: Reader): Segment[] {
  const text = decodeBody(part, defects, hintCharset);
  if (text === '') return [];
  if (!isMarkup(part.contentType)) {
    return [{ text: cleanText(text, part.number, defects), isQuoted }];
  }
  return readHtml(text, part.number, defects).segments.map((segment) => ({
    text: cleanText(segment.text, part.number, defects),
    isQuoted: isQuoted || segment.isQuoted,
  }));
}

/** RFC 1896: text/enriched has tags in angle brackets, and its readers skip those that they do not know. */
function isMarkup(contentType: string): boolean {
  return contentType === 'text/html' || contentType === 'text/enriched' || contentType === 'text/richtext';
}

/** Text that came as an attachment, for messages that have no other. */
function attachedText(part: Part, reader: Reader): Segment[] {
  if (isTextType(part.contentType) && part.disposition === 'attachment') return bodyText(part, false, reader);
  return part.children.flatMap((child) => attachedText(child, reader));
}

export function joinSegments(segments: readonly Segment[]): string {
  return segments
    .map(({ text }) => text.trimEnd().replace(/^\n+/, ''))
    .filter((text) => text !== '')
    .join('\n\n');
}

function hasText(segments: readonly Segment[]): boolean {
  return segments.some(({ text }) => hasWords(text));
}

function hasWords(text: string): boolean {
  return /[\p{L}\p{N}]/u.test(text);
}

/** Share of 48 words, taken evenly from one text, that the other text holds. Addresses of pages are no words. */
function sharedShare(text: string, other: string): number {
  const samples = 48;
  let taken = 0;
  let shared = 0;
  const word = /(?<![\p{L}\p{N}/@.:=_-])[\p{L}\p{N}]{2,}(?![\p{L}\p{N}/@:=_])/gu;
  for (let i = 0; i < samples; i++) {
    word.lastIndex = Math.max(word.lastIndex, Math.floor((i * text.length) / samples));
    const found = word.exec(text);
    if (found === null) break;
    taken++;
    // Scripts without spaces make runs that break elsewhere in the other form.
    if (other.includes(found[0].slice(0, /^[\x20-\x7e]+$/.test(found[0]) ? 24 : 4))) shared++;
  }
  return taken === 0 ? 1 : shared / taken;
}

function boundSegments(segments: readonly Segment[], defects: Defects): readonly Segment[] {
  let room: number = bounds.textCharsMax;
  const kept: Segment[] = [];
  for (const segment of segments) {
    if (segment.text.length > room) {
      defects.add('text-cut', 'message');
      if (room > 0) kept.push({ ...segment, text: cutText(segment.text, room) });
      break;
    }
    room -= segment.text.length;
    kept.push(segment);
  }
  return kept;
}
