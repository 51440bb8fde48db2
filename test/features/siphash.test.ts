import fc from 'fast-check';
import reference from 'siphash';
import { describe, expect, it } from 'vitest';
import { createSipHash } from '../../src/features/siphash.ts';
import { exampleKey } from './example.ts';

/** The bytes 0, 1, … count - 1 as text: below 0x80 a character is one byte of UTF-8. */
const bytesText = (count: number) => String.fromCharCode(...Array.from({ length: count }, (_, i) => i));
const { fingerprint, textToken, pairToken } = createSipHash(exampleKey);
const keyWords = [0x03020100, 0x07060504, 0x0b0a0908, 0x0f0e0d0c];
const low40 = ({ h, l }: { h: number; l: number }) => (h & 0xff) * 2 ** 32 + l;

describe('SipHash-2-4', () => {
  // Aumasson and Bernstein, "SipHash: a fast short-input PRF" (2012), appendix A: key 00..0f, message 00..0e.
  it('gives the worked example of its paper', () => {
    expect(fingerprint(bytesText(15))).toBe('a129ca6149be45e5');
  });

  // vectors_sip64 of the authors' reference code, read little endian: 31 0e 0e dd 47 db 6f 72 and so on.
  it.each([
    [0, '726fdb47dd0e0e31'],
    [1, '74f839c593dc67fd'],
    [2, '0d6c8009d9a94f5a'],
    [3, '85676696d7fb7e2d'],
    [4, 'cf2794e0277187b7'],
    [5, '18765564cd99a68d'],
    [6, 'cbc9466e58fee3ce'],
    [7, 'ab0200f58b01d137'],
    [8, '93f5f5799a932462'],
  ])('gives the published vector for a message of %i bytes', (count, expected) => {
    expect(fingerprint(bytesText(count))).toBe(expected);
  });

  it('keeps the low 40 bits as an exact integer', () => {
    expect(textToken(bytesText(15))).toBe(0x6149be45e5);
  });

  it('gives the leading bits as a fraction', () => {
    // a129ca6149be45e5 without its last 12 bits, over 2^52.
    expect(createSipHash(exampleKey).fraction(bytesText(15))).toBe(0xa129ca6149be4 / 2 ** 52);
  });

  it('hashes two tokens as ten bytes, low byte first', () => {
    const token = fc.nat({ max: 2 ** 31 - 1 }).map((n) => n * 512 + (n % 511));
    const five = (n: number) => [0, 8, 16, 24, 32].map((bits) => Math.floor(n / 2 ** bits) % 256);
    fc.assert(
      fc.property(token, token, (left, right) => {
        const expected = reference.hash(keyWords, Uint8Array.from([...five(left), ...five(right)]));
        expect(pairToken(left, right)).toBe(low40(expected));
      }),
      {
        seed: 20268,
        numRuns: 2000,
        examples: [
          [0, 0],
          [2 ** 40 - 1, 2 ** 40 - 1],
          [2 ** 39, 2 ** 32 - 1],
        ],
      },
    );
  });

  it('agrees with another implementation on texts of every length', () => {
    const text = fc.oneof(
      fc.string({ unit: 'binary', maxLength: 60 }),
      fc.string({ unit: 'grapheme', minLength: 200, maxLength: 800 }),
    );
    fc.assert(
      fc.property(text, (each) => {
        const expected = reference.hash(keyWords, new TextEncoder().encode(each));
        expect(textToken(each)).toBe(low40(expected));
        expect(Number.parseInt(fingerprint(each).slice(0, 8), 16)).toBe(expected.h);
      }),
      { seed: 20269, numRuns: 1000 },
    );
  });

  it('is not confused by what it hashed before', () => {
    textToken('something much longer than the next one');
    expect(fingerprint(bytesText(4))).toBe('cf2794e0277187b7');
    expect(fingerprint('é')).not.toBe(fingerprint('e'));
    expect(fingerprint(bytesText(4))).toBe('cf2794e0277187b7');
  });

  it('gives other answers under another key', () => {
    expect(createSipHash(new Uint8Array(16)).fingerprint('bill')).not.toBe(fingerprint('bill'));
  });

  it('takes a key that lies inside a larger buffer', () => {
    const inside = Uint8Array.of(9, 9, 9, ...exampleKey).subarray(3);
    expect(createSipHash(inside).fingerprint(bytesText(15))).toBe('a129ca6149be45e5');
  });

  it.each([0, 15, 17, 32])('refuses a key of %i bytes', (length) => {
    expect(() => createSipHash(new Uint8Array(length))).toThrow(
      `token-key-length at token key: expected 16 bytes, got ${length} bytes`,
    );
  });
});
