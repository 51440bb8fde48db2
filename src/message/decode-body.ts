import { Buffer, isAscii } from 'node:buffer';
import libmime from 'libmime';
import { decode as decodeCharset } from 'libmime/lib/charset.js';
import { decode as decodeQuotedPrintable } from 'libqp';
import type { Defects } from './defects.ts';
import type { Part } from './part.ts';

/** Replacement character of a decoder that met bytes it could not read. */
const replacement = '\ufffd';

/** Decodes the kept body of a text part: transfer encoding, charset, format=flowed; line ends become \n.
 *  `hintCharset` is tried for 8-bit bytes that nothing declares: the charset of the subject's encoded words. */
export function decodeBody(part: Part, defects: Defects, hintCharset: string): string {
  const bytes = decodeTransfer(part, Buffer.concat(part.pieces), defects);
  let charset = declaredCharset(part, bytes);
  if (isBinary(bytes, charset)) {
    charset = guessWide(bytes);
    defects.add(charset === '' ? 'text-unreadable' : 'charset-undeclared', part.number);
    if (charset === '') return '';
  }
  const text = decodeText(bytes, charset, part.number, defects, hintCharset);
  const lines = text.includes('\r') ? text.replace(/\r\n?/g, '\n') : text;
  if (part.contentType !== 'text/plain' || (part.params.format ?? '').trim().toLowerCase() !== 'flowed') {
    return lines;
  }
  return libmime.decodeFlowed(lines, (part.params.delsp ?? '').trim().toLowerCase() === 'yes');
}

function decodeTransfer(part: Part, bytes: Buffer, defects: Defects): Buffer {
  switch (part.transferEncoding) {
    case 'base64':
      return decodeBase64(bytes, part.number, defects);
    case 'quoted-printable':
      return decodeQuotedPrintable(bytes);
    case '':
    case '7bit':
    case '8bit':
    case 'binary':
      return bytes;
    default:
      defects.add('encoding-unknown', part.number);
      return bytes;
  }
}

/** RFC 2045 section 6.8: characters outside the alphabet are ignored. Padding in the middle, as programs leave it that
 *  join encoded pieces, ends a piece and not the body. */
function decodeBase64(bytes: Buffer, place: string, defects: Defects): Buffer {
  const text = bytes.toString('latin1');
  const strange = text.replace(/[A-Za-z0-9+/=\s]+/g, '');
  if (strange.length > 0) defects.add('encoding-damaged', place);
  // Not base64 at all: text that carries the label by mistake.
  if (strange.length * 20 > text.length) return bytes;
  const clean = text.replace(/[^A-Za-z0-9+/=]+/g, '');
  if (!/=[^=]/.test(clean)) return Buffer.from(clean, 'base64');
  return Buffer.concat(clean.split(/=+/).map((piece) => Buffer.from(piece, 'base64')));
}

/** The charset parameter; for HTML without one, what the document itself declares in its first 1,024 bytes. */
function declaredCharset(part: Part, bytes: Buffer): string {
  if (part.charset !== '' || part.contentType !== 'text/html') return part.charset;
  const head = bytes.toString('latin1', 0, 1024);
  return /<meta[^>]{0,200}?charset\s{0,9}=\s{0,9}["']?([\w.:-]{1,40})/i.exec(head)?.[1] ?? '';
}

/** Bytes to text. Declared charsets are believed unless the bytes are no text in them; the defect says what was done. */
export function decodeText(
  bytes: Buffer,
  declared: string,
  place: string,
  defects: Defects,
  hintCharset = '',
): string {
  if (isAscii(bytes) && !isStateful(declared)) {
    // UTF-7 can write markup that filters do not see; nobody decodes it any more.
    if (/utf-?7/i.test(declared)) defects.add('charset-unknown', place);
    return bytes.toString('latin1');
  }
  if (declared !== '' && !isAsciiName(declared) && !isUtf8Name(declared)) {
    if (isKnownCharset(declared)) {
      const text = decodeCharset(bytes, declared);
      if (text.includes(replacement)) defects.add('charset-damaged', place);
      return text.replaceAll(replacement, ' ');
    }
    defects.add('charset-unknown', place);
  }
  const utf8 = bytes.toString('utf8');
  if (!utf8.includes(replacement)) {
    if (declared === '' || isAsciiName(declared)) defects.add('charset-undeclared', place);
    return utf8;
  }
  // Mostly sound UTF-8 was damaged or cut; anything else was never UTF-8.
  if (countSound(utf8) > 2 * countOf(utf8, replacement)) {
    defects.add('charset-damaged', place);
    return utf8.replaceAll(replacement, '');
  }
  defects.add(declared === '' || isAsciiName(declared) ? 'charset-undeclared' : 'charset-damaged', place);
  const guess =
    hintCharset !== '' && isKnownCharset(hintCharset) && !isUtf8Name(hintCharset)
      ? hintCharset
      : 'windows-1252';
  return decodeCharset(bytes, guess).replaceAll(replacement, ' ');
}

/** Over a tenth control bytes: a file that carries the label of text by mistake or by intent. */
function isBinary(bytes: Buffer, charset: string): boolean {
  if (isStateful(charset)) return false;
  let controls = 0;
  for (let i = 0; i < bytes.length; i++) {
    const byte = bytes[i]!;
    if (byte < 0x20 && byte !== 0x09 && byte !== 0x0a && byte !== 0x0d && byte !== 0x1b && byte !== 0x0c)
      controls++;
  }
  return controls * 10 > bytes.length;
}

/** UTF-16 without a label: every other byte of Latin text is zero. */
function guessWide(bytes: Buffer): string {
  const sample = bytes.subarray(0, 400);
  const zeros = [0, 0];
  for (let i = 0; i < sample.length; i++) if (sample[i] === 0) zeros[i & 1]!++;
  const half = sample.length / 2;
  if (zeros[1]! > 0.6 * half && zeros[0]! < 0.05 * half) return 'utf-16le';
  return zeros[0]! > 0.6 * half && zeros[1]! < 0.05 * half ? 'utf-16be' : '';
}

const knownCharsets = new Map<string, boolean>();

/** Whether the decoder knows the name; asked once a name, and a bounded number is remembered. */
function isKnownCharset(name: string): boolean {
  const key = name.toLowerCase();
  const remembered = knownCharsets.get(key);
  if (remembered !== undefined) return remembered;
  let isKnown = false;
  try {
    isKnown = libmime.createDecodeStream(name).supported;
  } catch {
    // A name that the decoder refuses is as good as unknown.
  }
  if (knownCharsets.size < 200) knownCharsets.set(key, isKnown);
  return isKnown;
}

/** Charsets that write other scripts or wide characters with bytes below 0x80. */
function isStateful(name: string): boolean {
  return /^(?:csiso)?(?:iso-?2022|utf-?(?:16|32)|ucs|unicode|hz|cp037|ebcdic)/i.test(name);
}

function isAsciiName(name: string): boolean {
  return /^(?:us-?)?ascii$|^ansi_x3|^7bit$/i.test(name);
}

function isUtf8Name(name: string): boolean {
  return /^utf-?8/i.test(name);
}

function countOf(text: string, character: string): number {
  let count = 0;
  for (let at = text.indexOf(character); at >= 0; at = text.indexOf(character, at + 1)) count++;
  return count;
}

function countSound(text: string): number {
  let count = 0;
  for (let i = 0; i < text.length; i++) {
    const unit = text.charCodeAt(i);
    if (unit > 0x7f && unit !== 0xfffd) count++;
  }
  return count;
}
