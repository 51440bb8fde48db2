import { bounds } from '../bounds.ts';
import { bannerPhrases, deviceLines, headerNames, wroteEndings } from './reply-phrases.ts';
import type { Segment } from './segment-writer.ts';

interface Line {
  readonly text: string;
  readonly trimmed: string;
  readonly isQuoted: boolean;
}

/** What this writer wrote, out of all text: without quoted history, forwarded copies and signatures. When nothing with a
 *  letter or digit would be left, the whole text. A scanner over lines, linear. */
export function ownWords(segments: readonly Segment[], whole: string): string {
  if (segments.length === 1 && !segments[0]!.isQuoted && !mayHoldMore(whole)) return whole;
  const lines = segments.flatMap(({ text, isQuoted }) =>
    `${text}\n`.split('\n').map((line) => ({
      text: line,
      trimmed: line.trim(),
      isQuoted: line !== '' && (isQuoted || isQuoteLine(line)),
    })),
  );
  const own = dropDeviceLine(keepOwn(lines))
    .join('\n')
    .replace(/\n{3,}/g, '\n\n')
    .trim();
  return /[\p{L}\p{N}]/u.test(own) ? own : whole;
}

/** A quick look: text without any of these holds neither quotation nor signature. */
function mayHoldMore(text: string): boolean {
  return (
    /^[ \t]{0,3}\|?>|^-- ?$|[:：]\s*$|---|___|^.{0,40}[:：]/m.test(text) ||
    deviceLines.some((p) => p.test(lastLine(text)))
  );
}

function lastLine(text: string): string {
  return text.slice(text.lastIndexOf('\n') + 1, text.length).trim();
}

/** RFC 3676 section 4.5: quoted lines start with `>`; some clients put up to three spaces before it. */
function isQuoteLine(line: string): boolean {
  return /^[ \t]{0,3}\|?>/.test(line);
}

function keepOwn(lines: readonly Line[]): string[] {
  const own: string[] = [];
  let isSignature = false;
  for (let i = 0; i < lines.length; i++) {
    const line = lines[i]!;
    if (line.isQuoted) {
      isSignature = false;
      continue;
    }
    if (line.trimmed === '' || line.text.length > bounds.replyLineCharsMax) {
      if (!isSignature) own.push(line.text);
      continue;
    }
    const opening = openingAt(lines, i);
    if (opening !== null) {
      isSignature = false;
      i += opening.lines - 1;
      // What follows is history to the end, unless the quotation is marked line by line: then a reply may follow it.
      if (opening.isUnmarked) break;
      continue;
    }
    if (isSignatureLine(lines, i)) isSignature = true;
    if (!isSignature) own.push(line.text);
  }
  return own;
}

interface Opening {
  /** Lines that the introduction takes. */
  readonly lines: number;
  readonly isUnmarked: boolean;
}

/** An introduction of history at a line: a banner, a printed header or "On …, … wrote:" over up to three lines. */
function openingAt(lines: readonly Line[], at: number): Opening | null {
  const banner = isBanner(lines[at]!.trimmed);
  const headerLines = banner
    ? printedHeaderLines(lines, nextFilled(lines, at + 1))
    : printedHeaderLines(lines, at);
  if (banner || headerLines >= 3) {
    const end = (banner ? nextFilled(lines, at + 1) : at) + headerLines;
    return { lines: Math.max(1, end - at), isUnmarked: !isQuotedNext(lines, end) };
  }
  const count = attributionLines(lines, at);
  if (count === 0) return null;
  const isQuoted = isQuotedNext(lines, at + count);
  return { lines: count, isUnmarked: !isQuoted };
}

function isQuotedNext(lines: readonly Line[], from: number): boolean {
  return lines[nextFilled(lines, from)]?.isQuoted ?? false;
}

function nextFilled(lines: readonly Line[], from: number): number {
  let at = from;
  while (at < lines.length && lines[at]!.trimmed === '' && at < from + 5) at++;
  return at;
}

const banners = new RegExp(
  `^[\\s>*]*(?:[-_=–—]{2,}\\s*(?:${alternatives(bannerPhrases)})[^\\n]{0,60}?[-_=–—]{2,}|(?:${alternatives(bannerPhrases)})\\s*[:：])\\s*\\*?$`,
  'iu',
);

function isBanner(line: string): boolean {
  return line.length <= 120 && banners.test(line);
}

const fromLine = new RegExp(`^\\*?(?:${alternatives(headerNames.from)})\\s*\\*?\\s*[:：]`, 'iu');
const otherLine = new RegExp(
  `^\\*?(?:${alternatives([...headerNames.other, ...headerNames.from])})\\s*\\*?\\s*[:：]`,
  'iu',
);

/** Lines of a header as clients print it above a quoted message (From, Sent, To, Subject); 0 when there is none. */
function printedHeaderLines(lines: readonly Line[], at: number): number {
  let count = 0;
  let isFrom = false;
  let end = at;
  for (let i = at; i < lines.length && i < at + 12; i++) {
    const { trimmed, isQuoted } = lines[i]!;
    if (isQuoted || trimmed.length > bounds.replyLineCharsMax) break;
    if (trimmed === '' || /^[-_=]{5,}$/.test(trimmed)) {
      if (count > 0 && trimmed === '') break;
      continue;
    }
    if (fromLine.test(trimmed)) isFrom = true;
    else if (!otherLine.test(trimmed)) break;
    count++;
    end = i + 1;
  }
  return isFrom && count >= 3 ? end - at : 0;
}

const wroteEnd = new RegExp(`(?:${alternatives(wroteEndings)})\\s*[:：]?$`, 'iu');
/** Polish, French and others put the verb before the name: "Am … schrieb Anna:", "W dniu … Jan pisze:". */
const wroteInside = new RegExp(`(?:^|[\\s,>])(?:${alternatives(wroteEndings)})(?:[\\s:：]|$)`, 'iu');
const hasWhen = /\d{1,2}[:.]\d{2}|\d{4}|\d{1,2}[./-]\d{1,2}[./-]/;
const hasClock = /\d{1,2}[:.]\d{2}/;
const addressAtEnd = /[<(][^\s<>@]{1,64}@[^\s<>@]{1,255}[>)][:：]$/;
const hasAddress = /[<([]?[^\s<>@]{1,64}@[^\s<>@]{1,255}/;

/** How many lines from here make up an introduction of a quotation; 0 when none does. */
function attributionLines(lines: readonly Line[], at: number): number {
  let joined = '';
  for (let count = 1; count <= 3; count++) {
    const line = lines[at + count - 1];
    if (line === undefined || line.isQuoted || line.trimmed === '') return 0;
    joined = joined === '' ? line.trimmed : `${joined} ${line.trimmed}`;
    if (joined.length > 300) return 0;
    if (isAttribution(joined, isQuotedNext(lines, at + count))) return count;
    // Only a line that opens like one is carried on: a date, an address or the cue of a language.
    if (!hasWhen.test(joined) && !hasAddress.test(joined)) return 0;
    if (/[.!?。！？]$/.test(joined) && count > 1) return 0;
  }
  return 0;
}

function isAttribution(text: string, isQuotedNext: boolean): boolean {
  const isSure = isQuotedNext || hasAddress.test(text);
  if (/[:：]$/.test(text)) {
    // Prose dates what somebody wrote as well; mail clients add the time of day.
    if (wroteEnd.test(text)) return isSure || hasClock.test(text);
    if (wroteInside.test(text)) return isSure && hasWhen.test(text);
    // Some languages' clients write no verb: "2026年3月3日(火) 10:15 Name <a@b.example>:".
    return /\d{4}/.test(text) && hasClock.test(text) && addressAtEnd.test(text);
  }
  return wroteEnd.test(text) && hasWhen.test(text) && isSure;
}

/** RFC 3676 section 4.3: `-- ` alone on a line. Many programs drop the space; then only a short rest is a signature. */
function isSignatureLine(lines: readonly Line[], at: number): boolean {
  const { text } = lines[at]!;
  if (text === '-- ') return true;
  if (!/^(?:--|—)\s*$/.test(text)) return false;
  let filled = 0;
  for (let i = at + 1; i < lines.length && !lines[i]!.isQuoted; i++) {
    if (lines[i]!.trimmed !== '' && ++filled > 12) return false;
    if (filled > 0 && openingAt(lines, i) !== null) break;
  }
  return filled > 0;
}

/** Drops a last line such as "Sent from my phone", which the program adds by itself. */
function dropDeviceLine(own: string[]): string[] {
  let last = own.length - 1;
  while (last >= 0 && own[last]!.trim() === '') last--;
  if (last < 0) return own;
  const line = own[last]!.trim();
  return line.length <= 80 && deviceLines.some((pattern) => pattern.test(line)) ? own.slice(0, last) : own;
}

function alternatives(phrases: readonly string[]): string {
  // Longest first, so that the whole phrase is taken.
  return [...phrases]
    .sort((a, b) => b.length - a.length)
    .map((phrase) => phrase.replace(/[.*+?^${}()|[\]\\/]/g, '\\$&'))
    .join('|');
}
