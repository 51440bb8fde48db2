import siphash24 from 'siphash24';
import { TallypostError } from '../errors.ts';

/** Bytes of a desk's token key: SipHash takes a 128-bit key. */
export const tokenKeyBytes = 16;

/** SipHash-2-4 under one key. */
export interface SipHash {
  /** Low 40 bits of the hash of the text's UTF-8 bytes, as an integer. */
  textToken(text: string): number;
  /** Low 40 bits of the hash of two tokens, five bytes each, low byte first. */
  pairToken(left: number, right: number): number;
  /** The leading 52 bits of the hash as a fraction of all: uniform in [0, 1). */
  fraction(text: string): number;
  /** All 64 bits of the hash of the text's UTF-8 bytes, as 16 hex digits. */
  fingerprint(text: string): string;
}

const utf8 = new TextEncoder();
/** Texts of up to a third as many UTF-16 units are encoded in place. */
const scratch = new Uint8Array(768);
const pair = new Uint8Array(10);
/** The last hash, low byte first. */
const out = new Uint8Array(siphash24.BYTES);
const hashed = new DataView(out.buffer);

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
  // A copy: the caller's may change.
  const key = Uint8Array.from(tokenKey);
  const hash = (bytes: Uint8Array) => siphash24(bytes, key, out, true);
  const hashText = (text: string) => {
    const isShort = text.length * 3 <= scratch.length;
    hash(isShort ? scratch.subarray(0, utf8.encodeInto(text, scratch).written) : utf8.encode(text));
  };
  const token = () => out[4]! * 2 ** 32 + hashed.getUint32(0, true);
  return {
    textToken(text) {
      hashText(text);
      return token();
    },
    pairToken(left, right) {
      putFiveBytes(0, left);
      putFiveBytes(5, right);
      hash(pair);
      return token();
    },
    fraction(text) {
      hashText(text);
      return hashed.getUint32(4, true) * 2 ** -32 + (hashed.getUint32(0, true) >>> 12) * 2 ** -52;
    },
    fingerprint(text) {
      hashText(text);
      return hex(hashed.getUint32(4, true)) + hex(hashed.getUint32(0, true));
    },
  };
}

function putFiveBytes(at: number, token: number): void {
  pair[at] = token;
  pair[at + 1] = token >>> 8;
  pair[at + 2] = token >>> 16;
  pair[at + 3] = token >>> 24;
  pair[at + 4] = token * 2 ** -32;
}

function hex(half: number): string {
  return half.toString(16).padStart(8, '0');
}
