import { tokenBits } from './schema.ts';

/** Sorts tokens ascending, in place. They are hashes, spread evenly below 2^40, so that each falls close to its place by its
 *  leading bits alone: time grows with their number only, and no sender can spread them otherwise without the key. A
 *  general sort took a quarter of reading the features. `scratch` must hold as many. */
export function sortTokens(tokens: Float64Array, scratch: Float64Array): Float64Array {
  const { length } = tokens;
  const bits = Math.min(12, Math.max(1, 32 - Math.clz32(length)));
  // A power of two: exact in a product.
  const scale = 2 ** (bits - tokenBits);
  const start = new Uint16Array(2 ** bits + 1);
  for (let i = 0; i < length; i++) start[((tokens[i]! * scale) | 0) + 1]!++;
  for (let bucket = 1; bucket < start.length; bucket++) start[bucket]! += start[bucket - 1]!;
  for (let i = 0; i < length; i++) scratch[start[(tokens[i]! * scale) | 0]!++] = tokens[i]!;
  // Nearly sorted now: insertion moves a token past the few of its own bucket.
  for (let i = 0; i < length; i++) {
    const token = scratch[i]!;
    let at = i;
    while (at > 0 && tokens[at - 1]! > token) {
      tokens[at] = tokens[at - 1]!;
      at -= 1;
    }
    tokens[at] = token;
  }
  return tokens;
}
