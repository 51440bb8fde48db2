import { describe, expect, it } from 'vitest';
import { createTokenHash, fingerprint } from '../../src/features/token-hash.ts';
import { exampleKey } from './example.ts';

/** The bytes 0, 1, … count - 1 as text: below 0x80 a character is one byte of UTF-8. */
const bytesText = (count: number) => String.fromCharCode(...Array.from({ length: count }, (_, i) => i));

describe('token hash', () => {
  // Aumasson and Bernstein, "SipHash: a fast short-input PRF" (2012), appendix A: key 00..0f, message 00..0e.
  it('gives the 64 bits of the worked example of the SipHash paper', () => {
    expect(fingerprint(exampleKey, bytesText(15))).toBe('a129ca6149be45e5');
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
    expect(fingerprint(exampleKey, bytesText(count))).toBe(expected);
  });

  it('keeps the low 40 bits as an exact integer', () => {
    expect(createTokenHash(exampleKey)(bytesText(15))).toBe(0x6149be45e5);
  });

  it('hashes the UTF-8 bytes of what is not ASCII', () => {
    // é is c3 a9: the same bytes as two characters do not exist in UTF-8 text, so compare with the library's own bytes.
    expect(createTokenHash(exampleKey)('é')).not.toBe(createTokenHash(exampleKey)('e'));
  });

  it('gives other tokens under another key', () => {
    const other = Uint8Array.from(exampleKey).fill(7, 0, 1);
    expect(createTokenHash(other)('bill')).not.toBe(createTokenHash(exampleKey)('bill'));
  });

  it('remembers without changing an answer, past the bound of its memory', () => {
    const hash = createTokenHash(exampleKey);
    const first = hash('word 0');
    for (let i = 1; i < 140_000; i++) hash(`word ${i}`);
    expect(hash('word 0')).toBe(first);
  });

  it.each([0, 15, 17, 32])('refuses a key of %i bytes', (length) => {
    expect(() => createTokenHash(new Uint8Array(length))).toThrow(
      `token-key-length at token key: expected 16 bytes, got ${length} bytes`,
    );
  });
});
