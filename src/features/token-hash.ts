import siphash from 'siphash';
import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';

/** Bytes of a desk's token key: SipHash takes a 128-bit key. */
export const tokenKeyBytes = 16;

/** Token text to an integer below 2^40. */
export type TokenHash = (token: string) => number;

/** SipHash-2-4 (Aumasson and Bernstein, 2012) of the token's UTF-8 bytes under the desk's key, cut to its low 40 bits.
 *  Without the key nobody can test which words a table holds, nor choose words that collide.
 *  Throws TallypostError `token-key-length` when the key is not 16 bytes. */
export function createTokenHash(tokenKey: Uint8Array): TokenHash {
  const key = keyWords(tokenKey);
  // Two generations: a full one becomes the old one, so that memory is bounded and frequent tokens stay at hand.
  let recent = new Map<string, number>();
  let older = new Map<string, number>();
  return (token) => {
    let hash = recent.get(token);
    if (hash !== undefined) return hash;
    hash = older.get(token);
    if (hash === undefined) {
      const { h, l } = siphash.hash(key, token);
      hash = (h & 0xff) * 2 ** 32 + l;
    }
    if (recent.size >= bounds.rememberedTokensMax) {
      older = recent;
      recent = new Map();
    }
    recent.set(token, hash);
    return hash;
  };
}

/** 16 hex digits: SipHash-2-4 of `text` under the key, all 64 bits. */
export function fingerprint(tokenKey: Uint8Array, text: string): string {
  return siphash.hash_hex(keyWords(tokenKey), text);
}

function keyWords(tokenKey: Uint8Array): number[] {
  if (tokenKey.length !== tokenKeyBytes) {
    throw new TallypostError({
      code: 'token-key-length',
      place: 'token key',
      expected: `${tokenKeyBytes} bytes`,
      got: `${tokenKey.length} bytes`,
    });
  }
  const view = new DataView(tokenKey.buffer, tokenKey.byteOffset, tokenKey.byteLength);
  return [0, 4, 8, 12].map((offset) => view.getUint32(offset, true));
}
