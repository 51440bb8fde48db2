import { startsAtMs, utcOffsetMinutes } from './calendar.ts';
import { attachmentsFor } from './files.ts';
import type { LanguageBook } from './languages.ts';
import type { Letter } from './letter.ts';
import {
  bytesOf,
  type Charset,
  headerDate,
  headerText,
  isWithin,
  type MimePart,
  multipart,
  type TransferEncoding,
  textPart,
} from './mime.ts';
import type { Chance } from './random.ts';
import type { QueueId } from './topic.ts';

const desk = 'fenmarkwater.example';
// biome-ignore format: one table
const aliasOf: Readonly<Record<QueueId, string>> = {
  billing: 'bills', 'meter-readings': 'readings', 'moving-home': 'moving', 'leaks-and-bursts': 'leaks', 'water-quality': 'quality',
  'sewer-flooding': 'drains', 'new-connections': 'developers', complaints: 'complaints', careers: 'careers', suppliers: 'purchasing',
};
const aliases = Object.values(aliasOf);

/** A letter as raw mail that arrives at `atMs`: RFC 5322 bytes, always valid UTF-8 as a whole. */
export function mailOf(letter: Letter, book: LanguageBook, atMs: number, chance: Chance): Uint8Array {
  const quoted = quotationFor(letter, book, atMs, chance);
  const own = ownText(letter, book, quoted.isForward, chance);
  const plain = quoted.text === '' ? own.text : `${own.text}\n\n${quoted.text}`;
  const html = `${own.html}${quoted.html}`;
  const content = bodyOf(plain, html, letter, chance);
  const files = attachmentsFor(letter.queue, chance);
  const whole = files.length > 0 ? multipart('mixed', [content, ...files], boundary(chance)) : content;
  return bytesOf(whole, headersOf(letter, quoted.prefix, atMs, chance));
}

function headersOf(letter: Letter, prefix: string, atMs: number, chance: Chance): [string, string][] {
  const { person } = letter;
  const sentAtMs = atMs - 1000 * (2 + chance.below(90));
  const style = chance.isTrue(0.5) ? 'B' : 'Q';
  const from = headerText(person.name, style);
  const to = recipientOf(letter.queue, chance);
  const headers: [string, string][] = [
    ['Return-Path', `<${person.address}>`],
    ['Received', `from mx.${person.address.split('@')[1]} by inbound.${desk}; ${headerDate(atMs, 0)}`],
    ['X-SES-Spam-Verdict', chance.isTrue(0.01) ? 'GRAY' : 'PASS'],
    ['X-SES-Virus-Verdict', 'PASS'],
    ['From', /^[\w .-]+$/.test(from) ? `"${from}" <${person.address}>` : `${from} <${person.address}>`],
    ['To', chance.isTrue(0.3) ? `Fenmark Water <${to}>` : to],
    ['Subject', headerText(`${prefix}${letter.subject}`, style)],
    ['Date', headerDate(sentAtMs, utcOffsetMinutes(sentAtMs))],
    ['Message-ID', `<${chance.hex(12)}@${person.address.split('@')[1]}>`],
    ['MIME-Version', '1.0'],
  ];
  if (prefix.startsWith('Re')) headers.push(['In-Reply-To', `<${chance.hex(12)}@${desk}>`]);
  if (letter.topic.id === 'supplier-offer' && chance.isTrue(0.4)) {
    headers.push(['List-Id', `<offers.${person.address.split('@')[1]}>`]);
  }
  return headers;
}

function recipientOf(queue: QueueId, chance: Chance): string {
  const alias = chance.isTrue(0.6) ? 'contact' : chance.isTrue(0.8) ? aliasOf[queue] : chance.pick(aliases);
  return `${alias}@${desk}`;
}

function ownText(
  letter: Letter,
  book: LanguageBook,
  isForward: boolean,
  chance: Chance,
): { text: string; html: string } {
  const { person } = letter;
  const paragraphs = isForward ? [chance.pick(book.shared.forwards)] : letter.paragraphs;
  const lines = [letter.greeting, ...paragraphs].filter((text) => text !== '');
  const signature: string[] = [];
  if (!letter.isShort || chance.isTrue(0.5)) {
    lines.push(letter.closing);
    signature.push(person.name);
    if (chance.isTrue(0.3)) signature.push(person.street, `${person.town} ${person.postcode}`);
    if (chance.isTrue(0.25)) signature.push(person.phone);
  }
  const device = chance.isTrue(0.15) ? chance.pick(book.shared.sentFrom) : '';
  const dashes = chance.isTrue(0.25) ? '-- \n' : '';
  const text = [...lines.map((line) => wrapped(line, 72)), dashes + signature.join('\n'), device]
    .filter((line) => line !== '')
    .join('\n\n');
  const html = [
    ...lines.map((line) => `<p>${escaped(line)}</p>`),
    signature.length > 0 ? `<div class="signature">${signature.map(escaped).join('<br>')}</div>` : '',
    device === '' ? '' : `<p>${escaped(device)}</p>`,
  ].join('\n');
  return { text, html };
}

interface Quotation {
  readonly prefix: '' | 'Re: ' | 'Fwd: ';
  readonly isForward: boolean;
  readonly text: string;
  readonly html: string;
}

/** What stands below the writer's own words: our earlier answer, or somebody's letter passed on. */
function quotationFor(letter: Letter, book: LanguageBook, atMs: number, chance: Chance): Quotation {
  const isReply = chance.isTrue(letter.isShort ? 0.8 : 0.18);
  const isForward = !isReply && !letter.isShort && chance.isTrue(0.04);
  const earlierAtMs = Math.max(startsAtMs - 86_400_000 * 9, atMs - 3600_000 * (4 + chance.below(140)));
  const date = headerDate(earlierAtMs, utcOffsetMinutes(earlierAtMs)).replace(/ \+\d{4}$/, '');
  if (isReply) {
    const lead = book.shared.attribution
      .replace('{date}', date)
      .replace('{who}', `Fenmark Water <contact@${desk}>`);
    const ours = ourAnswer(letter, chance);
    return {
      prefix: 'Re: ',
      isForward: false,
      text: `${lead}\n${ours.map((line) => `> ${line}`).join('\n>\n')}`,
      html: `<p>${escaped(lead)}</p><blockquote type="cite">${ours.map((line) => `<p>${escaped(line)}</p>`).join('')}</blockquote>`,
    };
  }
  if (!isForward) return { prefix: '', isForward, text: '', html: '' };
  const head = [
    book.shared.forwardRule,
    `Subject: ${letter.subject}`,
    `Date: ${date}`,
    `From: ${letter.person.name}`,
    'To: office',
  ];
  const passedOn = [...letter.paragraphs, letter.closing, letter.person.name];
  return {
    prefix: 'Fwd: ',
    isForward,
    text: `${head.join('\n')}\n\n${passedOn.map((line) => wrapped(line, 72)).join('\n\n')}`,
    html: `<p>${head.map(escaped).join('<br>')}</p>${passedOn.map((line) => `<p>${escaped(line)}</p>`).join('')}`,
  };
}

function ourAnswer(letter: Letter, chance: Chance): string[] {
  const middle = chance.pick([
    'We are looking into it and will come back to you within five working days.',
    'Please send us the missing details: account number, address and, if you have a meter, the latest reading.',
    'Our colleague will call you. If water is running in the street, please use the telephone at any hour.',
    'Your bill, your meter and a possible leak will all be checked.',
  ]);
  return [
    `Thank you for writing to Fenmark Water about "${letter.subject}".`,
    middle,
    'Fenmark Water, customer desk, Pump House Lane, Harrowfen',
  ];
}

function bodyOf(plain: string, html: string, letter: Letter, chance: Chance): MimePart {
  const layout = chance.weighted({ plain: 45, html: 18, alternative: 37 });
  const page = `<html><head><style>p { margin: 0 0 1em }</style></head><body>\n${html}\n</body></html>`;
  const charset = charsetFor(`${plain}${html}`, letter.person.language, chance);
  const asText = (kind: string, text: string) =>
    textPart(kind, text, charset, encodingFor(charset, text, chance));
  if (layout === 'plain') return asText('text/plain', plain);
  if (layout === 'html') return asText('text/html', page);
  return multipart('alternative', [asText('text/plain', plain), asText('text/html', page)], boundary(chance));
}

function charsetFor(text: string, language: string, chance: Chance): Charset {
  const older: Charset = language === 'polish' ? 'iso-8859-2' : 'iso-8859-1';
  if (isWithin('us-ascii', text)) return chance.isTrue(0.5) ? 'us-ascii' : 'utf-8';
  return chance.isTrue(0.35) && isWithin(older, text) ? older : 'utf-8';
}

/** Single-byte charsets are never sent as bare 8 bits, so that a message is UTF-8 as a whole and fits a JSON string. */
function encodingFor(charset: Charset, text: string, chance: Chance): TransferEncoding {
  const isLong = text.split('\n').some((line) => line.length > 900);
  if (charset === 'us-ascii' && !isLong && chance.isTrue(0.6)) return '7bit';
  if (charset === 'utf-8' && !isLong && chance.isTrue(0.4)) return '8bit';
  return chance.isTrue(0.6) ? 'quoted-printable' : 'base64';
}

export function boundary(chance: Chance): string {
  return `=_${chance.hex(16)}`;
}

function wrapped(text: string, charsMax: number): string {
  const lines: string[] = [''];
  for (const word of text.split(' ')) {
    const line = lines.at(-1) as string;
    if (line !== '' && line.length + word.length >= charsMax) lines.push(word);
    else lines[lines.length - 1] = line === '' ? word : `${line} ${word}`;
  }
  return lines.join('\n');
}

function escaped(text: string): string {
  return text.replace(/&/g, '&amp;').replace(/</g, '&lt;').replace(/>/g, '&gt;').replace(/£/g, '&pound;');
}
