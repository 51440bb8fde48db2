import { Buffer } from 'node:buffer';
import fc from 'fast-check';

/** One change of some bytes; positions are shares of the range that may be changed. */
export interface Mutation {
  readonly kind: 'delete' | 'repeat' | 'flip' | 'insert' | 'truncate' | 'swap';
  /** From 0 to below 1. */
  readonly at: number;
  readonly size: number;
  readonly token: string;
}

/** Pieces of syntax that parsers stumble over; one character a byte. */
const tokens = [
  '\r\n\r\n',
  '\r\n',
  '\n',
  '\r',
  '\0',
  '\0\0\0\0',
  '--',
  '----\r\n',
  '=?utf-8?B?',
  '?=',
  '=?x?Q?=ZZ?=',
  '"',
  '\\',
  '(',
  '((((',
  ')',
  '<',
  '>',
  '<!--',
  '-->',
  '<style>',
  '</p>',
  '<p hidden>',
  '&#x110000;',
  '&',
  ';',
  ':',
  ' : ',
  '\t',
  '    ',
  '=',
  '=\r\n',
  '=3D',
  '\xff\xfe',
  '\xc3',
  '\xe2\x82',
  '\x1b$B',
  '\x1b(B',
  '>',
  '> ',
  '-- \r\n',
  'Content-Type: multipart/mixed; boundary=""\r\n',
  'Content-Type: message/rfc822\r\n\r\n',
  'Content-Transfer-Encoding: base64\r\n',
  'charset=utf-7',
  'boundary=',
  'From ',
  'a'.repeat(2000),
  ' '.repeat(2000),
  ',',
  '@',
  '.',
  '__proto__: x\r\n',
];

export const mutation: fc.Arbitrary<Mutation> = fc.record({
  kind: fc.constantFrom(
    'delete' as const,
    'repeat' as const,
    'flip' as const,
    'insert' as const,
    'truncate' as const,
    'swap' as const,
  ),
  at: fc.double({ min: 0, max: 0.9999999, noNaN: true }),
  size: fc.integer({ min: 1, max: 60 }),
  token: fc.constantFrom(...tokens),
});

/** Applies a mutation to the bytes from `start` to `end`. */
export function mutate(
  raw: Buffer,
  { kind, at, size, token }: Mutation,
  start = 0,
  end = raw.length,
): Buffer {
  const from = start + Math.floor(at * (end - start));
  const to = Math.min(end, from + size);
  const before = raw.subarray(0, from);
  const piece = raw.subarray(from, to);
  const after = raw.subarray(to);
  switch (kind) {
    case 'delete':
      return Buffer.concat([before, after]);
    case 'repeat':
      return Buffer.concat([before, piece, piece, piece, after]);
    case 'flip':
      return Buffer.concat([
        before,
        Buffer.from(piece.map((byte, i) => byte ^ (1 << ((from + i) & 7)))),
        after,
      ]);
    case 'insert':
      return Buffer.concat([before, Buffer.from(token, 'latin1'), piece, after]);
    case 'truncate':
      return end === raw.length ? Buffer.from(before) : Buffer.concat([before, raw.subarray(end)]);
    case 'swap':
      return Buffer.concat([before, Buffer.from(piece).reverse(), after]);
  }
}
