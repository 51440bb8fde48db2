import type { RegionCounts } from './counts.ts';
import { type Hits, type Own, readHits } from './hits.ts';
import { addRegions, pickTokens } from './sparse.ts';
import { findRows, indexTokens, rowIn, type TokenIndex } from './token-index.ts';

/** A region of a served table with the entries that came after it laid over it: nothing of the table is copied. Rows are those
 *  of the table, then one for each token that only the later entries hold. */
export interface ScorerRegion {
  readonly base: TokenIndex & { readonly counts: RegionCounts };
  readonly later: Later | null;
  /** Column to queue, -1 for a queue that is not open; the table's columns, then those that only later entries have. */
  readonly queueOf: Int32Array;
  /** Tokens that the table knows to say nothing; no entry makes them new. */
  readonly pruned: TokenIndex;
  /** Tokens held by fewer messages score nothing. */
  readonly seenMin: number;
  readonly rows: number;
  /** Table and later entries summed, for whoever reads rows himself; made when it is first asked for. O(cells). */
  readonly counts: RegionCounts;
}

/** The change that later entries make; cells may be negative. */
interface Later {
  readonly counts: RegionCounts;
  /** Row of the table to row of the change. */
  readonly over: ReadonlyMap<number, number>;
  /** Tokens that the table does not hold, with their rows of the change. */
  readonly only: TokenIndex;
  readonly onlyRow: Uint32Array;
}

/** `counts` and `change` have their columns numbered as in `queueOf`. O(tokens of both). */
export function createRegion(
  counts: RegionCounts,
  change: RegionCounts | null,
  queueOf: Int32Array,
  pruned: Float64Array,
  seenMin: number,
): ScorerRegion {
  const base = { ...indexTokens(counts.tokens), counts };
  const dropped = indexTokens(pruned);
  const unpruned = change === null ? null : without(change, dropped);
  const later = unpruned === null ? null : layOver(base, unpruned);
  let merged: RegionCounts | null = null;
  return {
    base,
    later,
    queueOf,
    pruned: dropped,
    seenMin,
    rows: counts.tokens.length + (later === null ? 0 : later.onlyRow.length),
    get counts() {
      merged ??= unpruned === null ? counts : addRegions(counts, unpruned, 'zero', 'overlay');
      return merged;
    },
  };
}

function without(change: RegionCounts, dropped: TokenIndex): RegionCounts {
  const kept = [...change.tokens.keys()].filter((row) => rowIn(dropped, change.tokens[row]) < 0);
  return kept.length === change.tokens.length ? change : pickTokens(change, kept);
}

function layOver(base: TokenIndex, change: RegionCounts): Later {
  const over = new Map<number, number>();
  const only: number[] = [];
  const onlyRow: number[] = [];
  change.tokens.forEach((token, at) => {
    const row = rowIn(base, token);
    if (row >= 0) over.set(row, at);
    else {
      only.push(token);
      onlyRow.push(at);
    }
  });
  return {
    counts: change,
    over,
    only: indexTokens(Float64Array.from(only)),
    onlyRow: Uint32Array.from(onlyRow),
  };
}

/** Where a token stands among the region's rows; -1 when it was never seen or was pruned. */
export function locate({ base, later }: ScorerRegion, token: number): number {
  const row = rowIn(base, token);
  if (row >= 0 || later === null) return row;
  const at = rowIn(later.only, token);
  return at < 0 ? -1 : base.tokens.length + at;
}

/** As `locate`, of many ascending tokens at once. */
export function locateAll(region: ScorerRegion, tokens: Float64Array, rows: Int32Array): void {
  const { base, later } = region;
  findRows(base, tokens, rows);
  if (later === null) return;
  for (let i = 0; i < tokens.length; i++) if (rows[i] < 0) rows[i] = locate(region, tokens[i]);
}

/** Fills `hits` with a row's counts by open queue, those of a message left out. */
export function readRow(region: ScorerRegion, row: number, own: Own | null, hits: Hits): void {
  const { base, later, queueOf } = region;
  if (later === null) {
    readHits(base.counts, queueOf, row, own, hits);
    return;
  }
  const isBase = row < base.tokens.length;
  const change = isBase ? later.over.get(row) : later.onlyRow[row - base.tokens.length];
  hits.length = 0;
  hits.seen = 0;
  if (isBase) readHits(base.counts, queueOf, row, change === undefined ? own : null, hits);
  if (change === undefined) return;
  addChange(later.counts, queueOf, change, own, hits);
}

/** Adds a row of the change to what the table holds; what comes to nothing or less leaves. */
function addChange(
  counts: RegionCounts,
  queueOf: Int32Array,
  row: number,
  own: Own | null,
  hits: Hits,
): void {
  for (let p = counts.start[row]; p < counts.start[row + 1]; p++) {
    const k = queueOf[counts.column[p]];
    if (k < 0) continue;
    let at = 0;
    while (at < hits.length && hits.queue[at] !== k) at++;
    if (at === hits.length) {
      hits.queue[hits.length] = k;
      hits.count[hits.length++] = 0;
    }
    hits.count[at] += counts.count[p];
  }
  const length = hits.length;
  hits.length = 0;
  hits.seen = 0;
  for (let at = 0; at < length; at++) {
    const count = hits.count[at] - (own !== null && hits.queue[at] === own.queue ? own.weight : 0);
    if (count <= 0) continue;
    hits.queue[hits.length] = hits.queue[at];
    hits.count[hits.length++] = count;
    hits.seen += count;
  }
}

/** Tokens that the later entries added to the table, less those that they took the last count of. */
export function countAdded({ base, later }: ScorerRegion): number {
  if (later === null) return 0;
  const { counts, over, onlyRow } = later;
  const sum = (row: number) =>
    counts.count.subarray(counts.start[row], counts.start[row + 1]).reduce((a, b) => a + b, 0);
  let added = 0;
  for (const row of onlyRow) if (sum(row) > 0) added++;
  for (const [row, change] of over) {
    const less = sum(change);
    if (less >= 0) continue;
    const { start, count } = base.counts;
    if (count.subarray(start[row], start[row + 1]).reduce((a, b) => a + b, less) <= 0) added--;
  }
  return added;
}
