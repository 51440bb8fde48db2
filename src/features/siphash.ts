import siphash from 'siphash';
import { TallypostError } from '../errors.ts';

/** Bytes of a desk's token key: SipHash takes a 128-bit key. */
export const tokenKeyBytes = 16;

/** SipHash-2-4 under one key. */
export interface SipHash {
  /** Low 40 bits of the hash of the text's UTF-8 bytes, as an integer. */
  textToken(text: string): number;
  /** Low 40 bits of the hash of two tokens, five bytes each, low byte first. */
  pairToken(left: number, right: number): number;
  /** All 64 bits of the hash of the text's UTF-8 bytes, as 16 hex digits. */
  fingerprint(text: string): string;
}

/** SipHash-2-4, a keyed function made for short inputs: without the key nobody can test which words a table holds, nor
 *  choose words that collide.
 *  Source: Aumasson and Bernstein, "SipHash: a fast short-input PRF" (2012), section 2.
 *  Throws TallypostError `token-key-length` when the key is not 16 bytes. */
export function createSipHash(tokenKey: Uint8Array): SipHash {
  if (tokenKey.length !== tokenKeyBytes) {
    throw new TallypostError({
      code: 'token-key-length',
      place: 'token key',
      expected: `${tokenKeyBytes} bytes`,
      got: `${tokenKey.length} bytes`,
    });
  }
  const view = new DataView(tokenKey.buffer, tokenKey.byteOffset, tokenKey.byteLength);
  const key = [0, 4, 8, 12].map((offset) => view.getUint32(offset, true));
  const utf8 = new TextEncoder();
  const pair = new Uint8Array(10);
  const tokenOf = ({ h, l }: siphash.Halves) => (h & 0xff) * 2 ** 32 + (l >>> 0);
  return {
    textToken: (text) => tokenOf(siphash.hash(key, utf8.encode(text))),
    pairToken(left, right) {
      putFiveBytes(pair, 0, left);
      putFiveBytes(pair, 5, right);
      return tokenOf(siphash.hash(key, pair));
    },
    fingerprint(text) {
      const { h, l } = siphash.hash(key, utf8.encode(text));
      return hex(h) + hex(l);
    },
  };
}

function putFiveBytes(bytes: Uint8Array, at: number, token: number): void {
  const low = token % 2 ** 32;
  bytes[at] = low;
  bytes[at + 1] = low >>> 8;
  bytes[at + 2] = low >>> 16;
  bytes[at + 3] = low >>> 24;
  bytes[at + 4] = Math.floor(token / 2 ** 32);
}

function hex(half: number): string {
  return (half >>> 0).toString(16).padStart(8, '0');
}
