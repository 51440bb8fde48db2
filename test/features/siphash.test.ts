import fc from 'fast-check';
import reference from 'siphash';
import { describe, expect, it } from 'vitest';
import { createSipHash } from '../../src/features/siphash.ts';
import { exampleKey } from './example.ts';

/** The bytes 0, 1, … count - 1 as text: below 0x80 a character is one byte of UTF-8. */
const bytesText = (count: number) => String.fromCharCode(...Array.from({ length: count }, (_, i) => i));
const { fingerprint, token } = createSipHash(exampleKey);

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

  it('agrees with the package of that name for any key and bytes', () => {
    const bytes = (length: number) => fc.uint8Array({ minLength: length, maxLength: length });
    fc.assert(
      fc.property(bytes(16), fc.uint8Array({ maxLength: 80 }), (key, message) => {
        const words = [0, 4, 8, 12].map((at) => new DataView(key.buffer, key.byteOffset).getUint32(at, true));
        const { h, l } = reference.hash(words, message);
        expect(createSipHash(key).token(message, message.length)).toBe((h & 0xff) * 2 ** 32 + l);
      }),
      { seed: 20265, numRuns: 2000 },
    );
  });

  it('keeps the low 40 bits as an exact integer', () => {
    expect(
      token(
        Uint8Array.from({ length: 15 }, (_, i) => i),
        15,
      ),
    ).toBe(0x6149be45e5);
  });

  it('looks at no byte behind the length', () => {
    const bytes = Uint8Array.of(0, 1, 2, 3, 99, 99, 99, 99, 99, 99);
    expect(token(bytes, 4)).toBe(0x94e0277187b7 % 2 ** 40); // cf2794e0277187b7 above
  });

  it('hashes text by its UTF-8 bytes', () => {
    const { h, l } = reference.hash(
      [0x03020100, 0x07060504, 0x0b0a0908, 0x0f0e0d0c],
      Uint8Array.of(0xc3, 0xa9),
    );
    expect(fingerprint('é')).toBe(h.toString(16).padStart(8, '0') + l.toString(16).padStart(8, '0'));
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
