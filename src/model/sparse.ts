import { TallypostError } from '../errors.ts';
import { tokenHex } from '../features/schema.ts';
import type { RegionCounts } from './counts.ts';

/** What to do with a cell that would fall below zero: a fold refuses it, since something would be taken out that was never
 *  put in; an overlay on a pruned table takes it as zero, since the cell may have been pruned; the sum of two changes keeps
 *  it. */
export type Shortfall = 'refuse' | 'zero' | 'keep';

export function emptyRegion(columns: number): RegionCounts {
  return {
    tokens: new Float64Array(0),
    start: new Uint32Array(1),
    column: new Uint32Array(0),
    count: new Float64Array(0),
    total: new Float64Array(columns),
  };
}

/** Sum of two regions whose columns are numbered alike; either may hold negative cells.
 *  One pass over the sorted tokens of both: O(cells). Cells that come to zero vanish, and tokens without cells too.
 *  Throws TallypostError `counts-negative` when a cell falls below zero and that is refused. */
export function addRegions(
  a: RegionCounts,
  b: RegionCounts,
  shortfall: Shortfall,
  place: string,
): RegionCounts {
  const tokens = new Float64Array(a.tokens.length + b.tokens.length);
  const start = new Uint32Array(tokens.length + 1);
  const column = new Uint32Array(a.column.length + b.column.length);
  const count = new Float64Array(column.length);
  let cells = 0;
  let held = 0;
  let i = 0;
  let j = 0;
  while (i < a.tokens.length || j < b.tokens.length) {
    const token = Math.min(
      i < a.tokens.length ? a.tokens[i] : Infinity,
      j < b.tokens.length ? b.tokens[j] : Infinity,
    );
    let p = 0;
    let pEnd = 0;
    let q = 0;
    let qEnd = 0;
    if (a.tokens[i] === token) {
      p = a.start[i];
      pEnd = a.start[++i];
    }
    if (b.tokens[j] === token) {
      q = b.start[j];
      qEnd = b.start[++j];
    }
    const before = cells;
    while (p < pEnd || q < qEnd) {
      const left = p < pEnd ? a.column[p] : Infinity;
      const right = q < qEnd ? b.column[q] : Infinity;
      let sum = 0;
      if (left <= right) sum += a.count[p++];
      if (right <= left) sum += b.count[q++];
      if (sum < 0) {
        if (shortfall === 'refuse') throw negative(`${place}, token ${tokenHex(token)}`, sum);
        if (shortfall === 'zero') sum = 0;
      }
      if (sum === 0) continue;
      column[cells] = Math.min(left, right);
      count[cells++] = sum;
    }
    if (cells > before) {
      tokens[held++] = token;
      start[held] = cells;
    }
  }
  return {
    tokens: tokens.slice(0, held),
    start: start.slice(0, held + 1),
    column: column.slice(0, cells),
    count: count.slice(0, cells),
    total: addArrays(a.total, b.total, shortfall, `${place}, total`),
  };
}

/** Element-wise sum of equally long arrays. */
export function addArrays(
  a: Float64Array,
  b: Float64Array,
  shortfall: Shortfall,
  place: string,
): Float64Array {
  return a.map((value, i) => {
    const sum = value + b[i];
    if (sum >= 0 || shortfall === 'keep') return sum;
    if (shortfall === 'zero') return 0;
    throw negative(place, sum);
  });
}

/** Adds `value` to column `target` of the row that stands ascending at `from` to `end`; gives where the row ends then. Rows are
 *  short and mostly filled in order: insertion keeps them sorted and adds where columns meet. */
export function addToRow(
  column: Uint32Array,
  count: Float64Array,
  from: number,
  end: number,
  target: number,
  value: number,
): number {
  let at = end;
  while (at > from && column[at - 1] > target) at--;
  if (at > from && column[at - 1] === target) {
    count[at - 1] += value;
    return end;
  }
  column.copyWithin(at + 1, at, end);
  count.copyWithin(at + 1, at, end);
  column[at] = target;
  count[at] = value;
  return end + 1;
}

/** The region with every column renumbered: old column c becomes `to[c]` (-1 drops it), its counts times `weight[c]`.
 *  Columns that meet are added. Weights of zero drop the column. Rows stay ascending by the new column. */
export function remapRegion(
  region: RegionCounts,
  to: ArrayLike<number>,
  weight: ArrayLike<number>,
  columns: number,
): RegionCounts {
  const tokens = new Float64Array(region.tokens.length);
  const start = new Uint32Array(tokens.length + 1);
  const column = new Uint32Array(region.column.length);
  const count = new Float64Array(column.length);
  let cells = 0;
  let held = 0;
  for (let i = 0; i < region.tokens.length; i++) {
    const first = cells;
    for (let p = region.start[i]; p < region.start[i + 1]; p++) {
      const target = to[region.column[p]];
      const value = region.count[p] * weight[region.column[p]];
      if (target < 0 || value === 0) continue;
      cells = addToRow(column, count, first, cells, target, value);
    }
    if (cells > first) {
      tokens[held++] = region.tokens[i];
      start[held] = cells;
    }
  }
  const total = new Float64Array(columns);
  for (let c = 0; c < region.total.length; c++) if (to[c] >= 0) total[to[c]] += region.total[c] * weight[c];
  return {
    tokens: tokens.slice(0, held),
    start: start.slice(0, held + 1),
    column: column.slice(0, cells),
    count: count.slice(0, cells),
    total,
  };
}

/** The rows at `kept`, ascending; totals stay. */
export function pickTokens(region: RegionCounts, kept: ArrayLike<number>): RegionCounts {
  const tokens = new Float64Array(kept.length);
  const start = new Uint32Array(kept.length + 1);
  for (let n = 0; n < kept.length; n++) {
    tokens[n] = region.tokens[kept[n]];
    start[n + 1] = start[n] + region.start[kept[n] + 1] - region.start[kept[n]];
  }
  const column = new Uint32Array(start[kept.length]);
  const count = new Float64Array(start[kept.length]);
  for (let n = 0; n < kept.length; n++) {
    const [from, to] = [region.start[kept[n]], region.start[kept[n] + 1]];
    column.set(region.column.subarray(from, to), start[n]);
    count.set(region.count.subarray(from, to), start[n]);
  }
  return { tokens, start, column, count, total: region.total };
}

/** Where a token stands in the ascending list, or -1. Hashes are spread evenly, so the first guess by interpolation is
 *  near; the bracket is then halved when interpolation stalls: O(log log n) expected, O(log n) at worst. */
export function indexOfToken(tokens: Float64Array, token: number): number {
  let low = 0;
  let high = tokens.length - 1;
  for (let step = 0; low <= high; step++) {
    const least = tokens[low];
    const most = tokens[high];
    if (token < least || token > most) return -1;
    const guess =
      step < 6 && most > least
        ? low + Math.floor(((token - least) / (most - least)) * (high - low))
        : (low + high) >>> 1;
    const value = tokens[guess];
    if (value === token) return guess;
    if (value < token) low = guess + 1;
    else high = guess - 1;
  }
  return -1;
}

export function negative(place: string, got: number): TallypostError {
  return new TallypostError({
    code: 'counts-negative',
    place,
    expected: 'a count of at least 0',
    got: String(got),
  });
}
