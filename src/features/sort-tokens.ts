import { tokenBits } from './schema.ts';

const bucketBitsMax = 12;
/** Of each bucket first how many tokens it has, then where its next one goes. */
const starts = new Uint16Array(2 ** bucketBitsMax + 1);

/** The first `length` of `tokens` ascending, in `sorted` (which must hold as many, and be another array). They are hashes,
 *  spread evenly below 2^40, so that each falls close to its place by its leading bits alone: time grows with their number
 *  only, and no sender can spread them otherwise without the key. A general sort took a quarter of reading the features.
 *  At most 2^16 - 1 tokens. */
export function sortTokens(tokens: Float64Array, length: number, sorted: Float64Array): Float64Array {
  const bits = Math.min(bucketBitsMax, Math.max(1, 32 - Math.clz32(length)));
  const buckets = 2 ** bits;
  // A power of two: exact in a product.
  const scale = 2 ** (bits - tokenBits);
  starts.fill(0, 0, buckets + 1);
  for (let i = 0; i < length; i++) starts[((tokens[i]! * scale) | 0) + 1]!++;
  for (let bucket = 1; bucket < buckets; bucket++) starts[bucket]! += starts[bucket - 1]!;
  for (let i = 0; i < length; i++) sorted[starts[(tokens[i]! * scale) | 0]!++] = tokens[i]!;
  // Nearly sorted now: insertion moves a token past the few of its own bucket.
  for (let i = 1; i < length; i++) {
    const token = sorted[i]!;
    let at = i;
    while (at > 0 && sorted[at - 1]! > token) {
      sorted[at] = sorted[at - 1]!;
      at -= 1;
    }
    sorted[at] = token;
  }
  return sorted;
}
