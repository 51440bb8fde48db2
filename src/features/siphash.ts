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
 *  choose words that collide. Written out in 32-bit halves, since the package of that name takes twenty times as long, more
 *  than parsing the mail; the tests hold both to the same answers.
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
  const out = new Int32Array(2);
  const pair = new Int32Array(4);
  let message = new Int32Array(64);

  function hashText(text: string): void {
    const lengthMax = 3 * text.length;
    if (message.length * 4 < lengthMax + 8) message = new Int32Array(Math.ceil(lengthMax / 4) + 4);
    let length = packAscii(text, message);
    if (length === -1) {
      const bytes = new TextEncoder().encode(text);
      length = bytes.length;
      message.fill(0, 0, ((length >>> 3) + 1) * 2);
      for (let i = 0; i < length; i++) message[i >>> 2]! |= bytes[i]! << ((i & 3) << 3);
    }
    const words = (length >>> 3) + 1;
    // The last word ends in the length, and may hold nothing else.
    message[2 * words - 1]! |= length << 24;
    hash(key, message, words, out);
  }

  const token = () => (out[1]! & 0xff) * 2 ** 32 + (out[0]! >>> 0);
  return {
    textToken(text) {
      hashText(text);
      return token();
    },
    pairToken(left, right) {
      pair[0] = left;
      pair[1] = Math.trunc(left / 2 ** 32) | (right << 8);
      pair[2] = Math.trunc(right / 2 ** 24);
      pair[3] = 10 << 24;
      hash(key, pair, 2, out);
      return token();
    },
    fingerprint(text) {
      hashText(text);
      return hex(out[1]!) + hex(out[0]!);
    },
  };
}

/** Writes an ASCII text's bytes as words, the rest of the last word zero; gives its length, or -1 when it is not ASCII. */
function packAscii(text: string, message: Int32Array): number {
  message.fill(0, 0, ((text.length >>> 3) + 1) * 2);
  for (let i = 0; i < text.length; i++) {
    const unit = text.charCodeAt(i);
    if (unit > 0x7f) return -1;
    message[i >>> 2]! |= unit << ((i & 3) << 3);
  }
  return text.length;
}

function hex(half: number): string {
  return (half >>> 0).toString(16).padStart(8, '0');
}

/** Hashes `words` words of 64 bits, each its low half first, the last ending in the message's length. Writes the low and the
 *  high half of the hash to `out`. */
function hash(key: Int32Array, message: Int32Array, words: number, out: Int32Array): void {
  // "somepseudorandomlygeneratedbytes", the constants of section 2.1: v0 to v3, each low half first.
  let v0l = key[0]! ^ 0x70736575;
  let v0h = key[1]! ^ 0x736f6d65;
  let v1l = key[2]! ^ 0x6e646f6d;
  let v1h = key[3]! ^ 0x646f7261;
  let v2l = key[0]! ^ 0x6e657261;
  let v2h = key[1]! ^ 0x6c796765;
  let v3l = key[2]! ^ 0x79746573;
  let v3h = key[3]! ^ 0x74656462;
  for (let w = 0; w <= words; w++) {
    const isLast = w === words;
    const ml = isLast ? 0 : message[2 * w]!;
    const mh = isLast ? 0 : message[2 * w + 1]!;
    const rounds = isLast ? 4 : 2;
    if (isLast) v2l ^= 0xff;
    v3l ^= ml;
    v3h ^= mh;
    for (let round = 0; round < rounds; round++) {
      // SipRound. A sum's low half carries where both addends have the top bit, or one has it and the sum has not: without
      // a branch, which would be mispredicted half of the time.
      let sum = (v0l + v1l) | 0;
      v0h = (v0h + v1h + (((v0l & v1l) | ((v0l | v1l) & ~sum)) >>> 31)) | 0;
      v0l = sum;
      let low = (v1l << 13) | (v1h >>> 19);
      v1h = ((v1h << 13) | (v1l >>> 19)) ^ v0h;
      v1l = low ^ v0l;
      low = v0l;
      v0l = v0h;
      v0h = low;
      sum = (v2l + v3l) | 0;
      v2h = (v2h + v3h + (((v2l & v3l) | ((v2l | v3l) & ~sum)) >>> 31)) | 0;
      v2l = sum;
      low = (v3l << 16) | (v3h >>> 16);
      v3h = ((v3h << 16) | (v3l >>> 16)) ^ v2h;
      v3l = low ^ v2l;
      sum = (v0l + v3l) | 0;
      v0h = (v0h + v3h + (((v0l & v3l) | ((v0l | v3l) & ~sum)) >>> 31)) | 0;
      v0l = sum;
      low = (v3l << 21) | (v3h >>> 11);
      v3h = ((v3h << 21) | (v3l >>> 11)) ^ v0h;
      v3l = low ^ v0l;
      sum = (v2l + v1l) | 0;
      v2h = (v2h + v1h + (((v2l & v1l) | ((v2l | v1l) & ~sum)) >>> 31)) | 0;
      v2l = sum;
      low = (v1l << 17) | (v1h >>> 15);
      v1h = ((v1h << 17) | (v1l >>> 15)) ^ v2h;
      v1l = low ^ v2l;
      low = v2l;
      v2l = v2h;
      v2h = low;
    }
    v0l ^= ml;
    v0h ^= mh;
  }
  out[0] = v0l ^ v1l ^ v2l ^ v3l;
  out[1] = v0h ^ v1h ^ v2h ^ v3h;
}
