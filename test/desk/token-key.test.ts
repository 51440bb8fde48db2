import { describe, expect, it } from 'vitest';
import { readTokenKey, writeTokenKey } from '../../src/desk/token-key.ts';

describe('token key', () => {
  it('is read from 32 hex digits, with white space around', () => {
    expect([...readTokenKey('000102030405060708090A0b0c0d0e0f\n', 'x')]).toEqual([
      0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15,
    ]);
  });

  it('is written as it is read', () => {
    expect(writeTokenKey(readTokenKey('ff0102030405060708090a0b0c0d0e0f', 'x'))).toBe(
      'ff0102030405060708090a0b0c0d0e0f',
    );
  });

  it.each([
    ['', 'nothing'],
    ['abc', '3 characters'],
    ['zz0102030405060708090a0b0c0d0e0f', '32 characters, not all hex digits'],
  ])('“%s” is refused without being shown', (text, got) => {
    expect(() => readTokenKey(text, 'config/token-key')).toThrow(
      `token-key-unreadable at config/token-key: expected 32 hex digits, got ${got}`,
    );
  });
});
