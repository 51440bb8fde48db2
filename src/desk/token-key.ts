import { TallypostError } from '../errors.ts';

/** The desk's secret of 16 bytes, written as 32 hex digits; white space around them is ignored.
 *  Throws TallypostError `token-key-unreadable`, which never shows the key. */
export function readTokenKey(text: string, place: string): Uint8Array {
  const digits = text.trim();
  if (!/^[0-9a-fA-F]{32}$/.test(digits)) {
    throw new TallypostError({
      code: 'token-key-unreadable',
      place,
      expected: '32 hex digits',
      got:
        digits === ''
          ? 'nothing'
          : `${digits.length} characters${digits.length === 32 ? ', not all hex digits' : ''}`,
    });
  }
  return Uint8Array.from(Buffer.from(digits, 'hex'));
}

/** The inverse of readTokenKey. */
export function writeTokenKey(tokenKey: Uint8Array): string {
  return Buffer.from(tokenKey).toString('hex');
}
