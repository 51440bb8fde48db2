/** Writes mail as bytes: RFC 5322 headers, RFC 2045 to 2047 bodies and encoded words. */

export type Charset = 'utf-8' | 'iso-8859-1' | 'iso-8859-2' | 'us-ascii';
export type TransferEncoding = '7bit' | '8bit' | 'quoted-printable' | 'base64';

export interface MimePart {
  readonly headers: readonly (readonly [string, string])[];
  readonly body: Uint8Array;
}

/** The letters of Polish in ISO 8859-2. */
// biome-ignore format: one code table
const latin2: Readonly<Record<string, number>> = {
  Ą: 0xa1, ą: 0xb1, Ć: 0xc6, ć: 0xe6, Ę: 0xca, ę: 0xea, Ł: 0xa3, ł: 0xb3, Ń: 0xd1, ń: 0xf1,
  Ó: 0xd3, ó: 0xf3, Ś: 0xa6, ś: 0xb6, Ź: 0xac, ź: 0xbc, Ż: 0xaf, ż: 0xbf,
};

/** Whether the charset holds every letter of the text. */
export function isWithin(charset: Charset, text: string): boolean {
  if (charset === 'utf-8') return true;
  const isExtra = (letter: string) =>
    charset === 'iso-8859-1'
      ? (letter.codePointAt(0) as number) < 0x100
      : charset === 'iso-8859-2' && letter in latin2;
  return [...text].every((letter) => (letter.codePointAt(0) as number) < 0x80 || isExtra(letter));
}

export function encodeText(text: string, charset: Charset): Uint8Array {
  if (charset === 'utf-8') return Buffer.from(text, 'utf8');
  return Uint8Array.from([...text], (letter) =>
    charset === 'iso-8859-2' ? (latin2[letter] ?? letter.charCodeAt(0)) : letter.charCodeAt(0),
  );
}

export function textPart(kind: string, text: string, charset: Charset, encoding: TransferEncoding): MimePart {
  const bytes = encodeText(text.replace(/\r?\n/g, '\r\n'), charset);
  return {
    headers: [
      ['Content-Type', `${kind}; charset=${charset}`],
      ['Content-Transfer-Encoding', encoding],
    ],
    body: transferred(bytes, encoding),
  };
}

export function filePart(type: string, name: string, bytes: Uint8Array): MimePart {
  return {
    headers: [
      ['Content-Type', `${type}; name="${name}"`],
      ['Content-Disposition', `attachment; filename="${name}"`],
      ['Content-Transfer-Encoding', 'base64'],
    ],
    body: transferred(bytes, 'base64'),
  };
}

export function multipart(
  subtype: string,
  parts: readonly MimePart[],
  boundary: string,
  parameters = '',
): MimePart {
  const lines: Uint8Array[] = [];
  for (const part of parts) {
    lines.push(Buffer.from(`--${boundary}\r\n`), bytesOf(part), Buffer.from('\r\n'));
  }
  lines.push(Buffer.from(`--${boundary}--\r\n`));
  return {
    headers: [['Content-Type', `multipart/${subtype}; ${parameters}boundary="${boundary}"`]],
    body: Buffer.concat(lines),
  };
}

/** A part, or with the message's own headers in front, a whole message. */
export function bytesOf(part: MimePart, front: readonly (readonly [string, string])[] = []): Uint8Array {
  const headers = [...front, ...part.headers].map(([name, value]) => `${name}: ${value}\r\n`).join('');
  return Buffer.concat([Buffer.from(`${headers}\r\n`), part.body]);
}

function transferred(bytes: Uint8Array, encoding: TransferEncoding): Uint8Array {
  if (encoding === 'base64') {
    const text = Buffer.from(bytes).toString('base64');
    return Buffer.from(text.replace(/.{76}/g, '$&\r\n'));
  }
  return encoding === 'quoted-printable' ? quotedPrintable(bytes) : bytes;
}

/** RFC 2045 section 6.7: lines of at most 76 characters, the soft break included. */
function quotedPrintable(bytes: Uint8Array): Uint8Array {
  const lines = Buffer.from(bytes).toString('latin1').split('\r\n');
  const encoded = lines.map((line) => {
    let row = '';
    let rows = '';
    for (let i = 0; i < line.length; i += 1) {
      const code = line.charCodeAt(i);
      const isLastSpace = i === line.length - 1 && (code === 0x20 || code === 0x09);
      const isPlain = code >= 0x20 && code < 0x7f && code !== 0x3d && !isLastSpace;
      const unit = isPlain ? line[i] : `=${code.toString(16).toUpperCase().padStart(2, '0')}`;
      if (row.length + (unit as string).length > 75) {
        rows += `${row}=\r\n`;
        row = '';
      }
      row += unit;
    }
    return rows + row;
  });
  return Buffer.from(encoded.join('\r\n'), 'latin1');
}

/** A header value in ASCII; other letters become RFC 2047 words of at most 75 characters, cut between letters. */
export function headerText(text: string, style: 'B' | 'Q'): string {
  if (/^[\x20-\x7e]*$/.test(text)) return text;
  const words: string[] = [];
  let piece = '';
  for (const letter of text) {
    if (encodedWord(piece + letter, style).length > 75) {
      words.push(encodedWord(piece, style));
      piece = '';
    }
    piece += letter;
  }
  words.push(encodedWord(piece, style));
  return words.join('\r\n ');
}

function encodedWord(text: string, style: 'B' | 'Q'): string {
  const bytes = Buffer.from(text, 'utf8');
  if (style === 'B') return `=?utf-8?B?${bytes.toString('base64')}?=`;
  const quoted = [...bytes].map((byte) => {
    if (byte === 0x20) return '_';
    const letter = String.fromCharCode(byte);
    return /[A-Za-z0-9!*+/-]/.test(letter) ? letter : `=${byte.toString(16).toUpperCase().padStart(2, '0')}`;
  });
  return `=?utf-8?Q?${quoted.join('')}?=`;
}

/** RFC 5322 section 3.3, at the district's clock. */
export function headerDate(atMs: number, offsetMinutes: number): string {
  const local = new Date(atMs + offsetMinutes * 60_000).toUTCString().replace('GMT', '').trim();
  const hours = String(Math.trunc(offsetMinutes / 60)).padStart(2, '0');
  return `${local} +${hours}00`;
}
