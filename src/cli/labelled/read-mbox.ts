import { bounds } from '../../bounds.ts';
import { bad, type LabelledStream } from './labelled.ts';
import { readLines } from './read-lines.ts';

const fromStart = Buffer.from('From ');
const months = 'Jan Feb Mar Apr May Jun Jul Aug Sep Oct Nov Dec'.split(' ');
const timestamp =
  /\b(?:Mon|Tue|Wed|Thu|Fri|Sat|Sun)\s+(Jan|Feb|Mar|Apr|May|Jun|Jul|Aug|Sep|Oct|Nov|Dec)\s+(\d{1,2})\s+(\d\d):(\d\d)(?::(\d\d))?\s(?:.*\s)?((?:19|20)\d\d)\b/;

/** The time in a separator line; RFC 4155 has it in UTC in the form of asctime. Writers that add a zone behind or
 *  before the year are common practice: a numeric zone is honoured, a named one other than UTC is not known here. */
export function separatorTimeMs(line: string): number | null {
  const found = timestamp.exec(line);
  if (found === null) return null;
  const [, month, day, hour, minute, second, year] = found;
  const ms = Date.UTC(
    Number(year),
    months.indexOf(month!),
    Number(day),
    Number(hour),
    Number(minute),
    Number(second ?? 0),
  );
  const zone = /\s([+-])(\d\d):?(\d\d)\b/.exec(line);
  if (zone === null) return ms;
  const offsetMs = (Number(zone[2]) * 60 + Number(zone[3])) * 60_000;
  return zone[1] === '+' ? ms - offsetMs : ms + offsetMs;
}

/** Messages of an mbox file (RFC 4155, application/mbox).
 *
 *  A separator is a line that starts with `From ` and either carries the asctime stamp that RFC 4155 asks for, or stands
 *  at the file's start or after an empty line in a file whose own first separator carries none. A sentence that starts
 *  with "From " is therefore left in its message. One `>` is taken off lines of `>`s and `From `: the quoting that writers
 *  commonly use, which the RFC leaves open; where a writer quoted only bare lines, a `>>From ` loses one `>` too many.
 *  Linear in the file; holds one message of at most rawBytesMax. */
export async function* readMbox(
  chunks: AsyncIterable<Uint8Array>,
  file: string,
  label: string,
): LabelledStream {
  let lines: Buffer[] | null = null;
  let bytes = 0;
  let isTooLarge = false;
  let startLine = 1;
  let atMs: number | null = null;
  let isAfterEmpty = true;
  let areStampsUsual = true;
  let isOutsideReported = false;

  const finish = () => {
    const place = `${file}:${startLine}`;
    if (isTooLarge)
      return bad(
        'message-too-large',
        place,
        `at most ${bounds.rawBytesMax} bytes a message`,
        `${bytes} bytes or more`,
      );
    const body = lines!;
    // The empty line before the next separator belongs to the format.
    if (body.length > 0 && body[body.length - 1]!.length === 0) body.pop();
    const raw = Buffer.concat(body.flatMap((line) => [line, crlf]));
    return { kind: 'item', label, atMs, place, content: { kind: 'mail', raw } } as const;
  };

  for await (const line of readLines(chunks, bounds.rawBytesMax)) {
    const content = line.bytes;
    if (content?.subarray(0, 5).equals(fromStart)) {
      const stamp = separatorTimeMs(content.subarray(0, 512).toString('latin1'));
      const isFirst = lines === null;
      if (stamp !== null || isFirst || (isAfterEmpty && !areStampsUsual)) {
        if (isFirst) areStampsUsual = stamp !== null;
        else yield finish();
        lines = [];
        bytes = 0;
        isTooLarge = false;
        startLine = line.number;
        atMs = stamp;
        isAfterEmpty = false;
        continue;
      }
    }
    isAfterEmpty = content !== null && content.length === 0;
    if (lines === null) {
      if (isAfterEmpty || isOutsideReported) continue;
      isOutsideReported = true;
      yield bad(
        'separator-missing',
        `${file}:${line.number}`,
        'a line that starts with "From "',
        'another line before the first message',
      );
      continue;
    }
    bytes += (content?.length ?? bounds.rawBytesMax) + 2;
    if (bytes > bounds.rawBytesMax) {
      isTooLarge = true;
      lines = [];
    } else lines.push(isQuotedFrom(content!) ? content!.subarray(1) : content!);
  }
  if (lines !== null) yield finish();
}

const crlf = Buffer.from('\r\n');

function isQuotedFrom(line: Buffer): boolean {
  let at = 0;
  while (line[at] === 0x3e) at += 1;
  return at > 0 && line.subarray(at, at + 5).equals(fromStart);
}
