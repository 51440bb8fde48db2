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
/** The blocks of a message, low half first, and afterwards the halves of its hash. */
let blocks = new Int32Array(scratch.length / 4 + 2);

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
  const key = Int32Array.from([0, 4, 8, 12], (offset) => view.getInt32(offset, true));
  const token = () => (blocks[1]! & 0xff) * 2 ** 32 + (blocks[0]! >>> 0);
  return {
    textToken(text) {
      hashBlocks(key, putText(text));
      return token();
    },
    pairToken(left, right) {
      const rightLow = right | 0;
      blocks[0] = left | 0;
      blocks[1] = (left * 2 ** -32) | (rightLow << 8);
      blocks[2] = (rightLow >>> 24) | (((right * 2 ** -32) | 0) << 8);
      // The last block ends with the number of bytes.
      blocks[3] = 10 << 24;
      hashBlocks(key, 2);
      return token();
    },
    fraction(text) {
      hashBlocks(key, putText(text));
      return (blocks[1]! >>> 0) * 2 ** -32 + (blocks[0]! >>> 12) * 2 ** -52;
    },
    fingerprint(text) {
      hashBlocks(key, putText(text));
      return hex(blocks[1]!) + hex(blocks[0]!);
    },
  };
}

/** Lays out the UTF-8 bytes of a text with the byte of their number at the end; answers how many blocks these are. */
function putText(text: string): number {
  const isShort = text.length * 3 <= scratch.length;
  const bytes = isShort ? scratch : utf8.encode(text);
  const length = isShort ? utf8.encodeInto(text, scratch).written : bytes.length;
  const count = (length >> 3) + 1;
  if (2 * count > blocks.length) blocks = new Int32Array(2 * count);
  const words = length >> 2;
  for (let i = 0, at = 0; i < words; i++, at += 4)
    blocks[i] = bytes[at]! | (bytes[at + 1]! << 8) | (bytes[at + 2]! << 16) | (bytes[at + 3]! << 24);
  blocks.fill(0, words, 2 * count);
  for (let at = 4 * words; at < length; at++) blocks[words]! |= bytes[at]! << (8 * (at & 3));
  blocks[2 * count - 1]! |= length << 24;
  return count;
}

/** Hashes the first `count` blocks; leaves the hash where the first one was. A 64-bit word is two halves in variables of their
 *  own: with an object a word, this took half the time of reading features. */
function hashBlocks(key: Int32Array, count: number): void {
  let l0 = key[0]! ^ 0x70736575;
  let h0 = key[1]! ^ 0x736f6d65;
  let l1 = key[2]! ^ 0x6e646f6d;
  let h1 = key[3]! ^ 0x646f7261;
  let l2 = key[0]! ^ 0x6e657261;
  let h2 = key[1]! ^ 0x6c796765;
  let l3 = key[2]! ^ 0x79746573;
  let h3 = key[3]! ^ 0x74656462;
  let t = 0;
  const compressions = 2 * count;
  for (let round = 0; round < compressions + 4; round++) {
    // Two rounds a block, between adding it to v3 and to v0; four to finish.
    if (round < compressions) {
      if ((round & 1) === 0) {
        l3 ^= blocks[round]!;
        h3 ^= blocks[round + 1]!;
      }
    } else if (round === compressions) l2 ^= 0xff;
    // v0 += v1; v2 += v3. A sum is below an addend when it carried.
    t = (l0 + l1) | 0;
    h0 = (h0 + h1 + (t >>> 0 < l0 >>> 0 ? 1 : 0)) | 0;
    l0 = t;
    t = (l2 + l3) | 0;
    h2 = (h2 + h3 + (t >>> 0 < l2 >>> 0 ? 1 : 0)) | 0;
    l2 = t;
    // v1 = (v1 <<< 13) ^ v0; v3 = (v3 <<< 16) ^ v2; v0 <<<= 32.
    t = (h1 << 13) | (l1 >>> 19);
    l1 = ((l1 << 13) | (h1 >>> 19)) ^ l0;
    h1 = t ^ h0;
    t = (h3 << 16) | (l3 >>> 16);
    l3 = ((l3 << 16) | (h3 >>> 16)) ^ l2;
    h3 = t ^ h2;
    t = l0;
    l0 = h0;
    h0 = t;
    // v2 += v1; v0 += v3.
    t = (l2 + l1) | 0;
    h2 = (h2 + h1 + (t >>> 0 < l2 >>> 0 ? 1 : 0)) | 0;
    l2 = t;
    t = (l0 + l3) | 0;
    h0 = (h0 + h3 + (t >>> 0 < l0 >>> 0 ? 1 : 0)) | 0;
    l0 = t;
    // v1 = (v1 <<< 17) ^ v2; v3 = (v3 <<< 21) ^ v0; v2 <<<= 32.
    t = (h1 << 17) | (l1 >>> 15);
    l1 = ((l1 << 17) | (h1 >>> 15)) ^ l2;
    h1 = t ^ h2;
    t = (h3 << 21) | (l3 >>> 11);
    l3 = ((l3 << 21) | (h3 >>> 11)) ^ l0;
    h3 = t ^ h0;
    t = l2;
    l2 = h2;
    h2 = t;
    if (round < compressions && (round & 1) === 1) {
      l0 ^= blocks[round - 1]!;
      h0 ^= blocks[round]!;
    }
  }
  blocks[0] = l0 ^ l1 ^ l2 ^ l3;
  blocks[1] = h0 ^ h1 ^ h2 ^ h3;
}

function hex(half: number): string {
  return (half >>> 0).toString(16).padStart(8, '0');
}
