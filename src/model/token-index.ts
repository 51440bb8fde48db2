import { tokenBits } from '../features/schema.ts';

/** Finds a token's row in about two memory reads: hashes are spread evenly, so their leading bits number buckets of some four
 *  tokens each. One pass to build. */
export interface TokenIndex {
  /** Ascending. */
  readonly tokens: Float64Array;
  /** Buckets a unit of hash: a power of two, so that the product is exact. */
  readonly density: number;
  /** First row of each bucket, and the end of the last; [buckets + 1]. */
  readonly first: Uint32Array;
}

export function indexTokens(tokens: Float64Array): TokenIndex {
  const buckets = 2 ** Math.max(0, Math.ceil(Math.log2(tokens.length + 1)) - 2);
  const density = buckets / 2 ** tokenBits;
  const first = new Uint32Array(buckets + 1);
  let bucket = 0;
  for (let row = 0; row < tokens.length; row++) {
    const at = Math.floor(tokens[row] * density);
    while (bucket < at) first[++bucket] = row;
  }
  while (bucket < buckets) first[++bucket] = tokens.length;
  return { tokens, density, first };
}

/** The row of a token, or -1. */
export function rowIn({ tokens, density, first }: TokenIndex, token: number): number {
  const bucket = Math.floor(token * density);
  const end = first[bucket + 1];
  for (let row = first[bucket]; row < end; row++)
    if (tokens[row] >= token) return tokens[row] === token ? row : -1;
  return -1;
}

/** What was read ahead; nobody asks for it, but reads whose result goes nowhere would not be made. */
const readAhead = new Float64Array(1);

/** Rows of many tokens, -1 where there is none; ascending tokens, `rows` at least as long. Each pass reads what the next one
 *  needs: reads that do not wait for each other overlap, and a table lies far from the processor. */
export function findRows(
  { tokens, density, first }: TokenIndex,
  asked: Float64Array,
  rows: Int32Array,
): void {
  const last = tokens.length - 1;
  for (let i = 0; i < asked.length; i++) rows[i] = first[Math.floor(asked[i] * density)];
  if (last < 0) {
    rows.fill(-1, 0, asked.length);
    return;
  }
  let sum = 0;
  for (let i = 0; i < asked.length; i++) sum += tokens[Math.min(rows[i], last)];
  readAhead[0] = sum;
  for (let i = 0; i < asked.length; i++) {
    const token = asked[i];
    let row = rows[i];
    while (row < last && tokens[row] < token) row++;
    rows[i] = row <= last && tokens[row] === token ? row : -1;
  }
}
