import { readRecipients, readSender } from './addresses.ts';
import { listAttachments } from './attachments.ts';
import { cleanLine } from './clean-text.ts';
import { Defects } from './defects.ts';
import { Fields, fieldText, hintCharsetOf, readUnstructured } from './fields.ts';
import { readHeaderFacts } from './header-facts.ts';
import { readMailDate } from './mail-date.ts';
import { joinSegments, readSegments } from './mail-text.ts';
import type { Message } from './message.ts';
import { ownWords } from './own-words.ts';
import { type RawMail, readParts } from './read-parts.ts';
import { rescueParts } from './rescue-parts.ts';

/** Parses raw mail (RFC 5322, MIME) into a bounded message. Never throws and never hangs: what was wrong and which
 *  bounds were reached stands in `defects`. Bytes may come whole or as a stream; `nowMs` (any monotonic clock, ms) enables
 *  the deadline on parsing. */
export async function parseMail(raw: RawMail, options: { nowMs?: () => number } = {}): Promise<Message> {
  const defects = new Defects();
  const read = await readParts(raw, defects, options.nowMs);
  await rescueParts(read.root, defects);
  const fields = new Fields(read.fields);
  const subjectField = fields.first('subject');
  const subject = readUnstructured(subjectField, 'subject', defects);
  const segments = readSegments(read.root, hintCharsetOf(subjectField), defects);
  const text = joinSegments(segments);
  if (text === '') defects.add('text-missing', 'message');
  return {
    channel: 'mail',
    messageId: readMessageId(fields, defects),
    from: readSender(fields, defects),
    recipients: readRecipients(fields, defects),
    subject,
    text,
    ownText: ownWords(segments, text),
    attachments: listAttachments(read.root, defects),
    facts: readHeaderFacts(fields, read.root),
    sentAtMs: readDate(fields, defects),
    form: null,
    defects: defects.list,
  };
}

/** RFC 5322 section 3.6.4, without the angle brackets. */
function readMessageId(fields: Fields, defects: Defects): string {
  const value = cleanLine(fieldText(fields.first('message-id').slice(0, 998)), 'message-id', defects);
  const id = /<([^<>]*)>/.exec(value)?.[1] ?? value;
  // RFC 5322 section 4.5.4: the obsolete form has white space and comments around its dots and @.
  return id.replace(/\([^()]*\)|\s+/g, '');
}

function readDate(fields: Fields, defects: Defects): number | null {
  const value = fields.first('date');
  if (value === '') return null;
  const sentAtMs = readMailDate(value);
  if (sentAtMs === null) defects.add('date-unreadable', 'date');
  return sentAtMs;
}
