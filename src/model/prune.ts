import { bounds } from '../bounds.ts';
import type { Counts, RegionCounts } from './counts.ts';
import type { Fit, Hold, Reading } from './fit.ts';
import { createHits, kindOf, readHits } from './hits.ts';
import { exposureOf, weighModels } from './rates.ts';
import { pickTokens } from './sparse.ts';

export const holdAll: Hold = { seenMin: {}, relevanceMin: 0, sparesNew: true };

/** Rules from lenient to strict. First go old tokens that were seen once or hardly depend on the queue; then tokens seen once,
 *  which are half of all and tell little, from the regions that hold most of them down to those that hold few; then ever
 *  more frequent ones. `regions` by falling number of tokens. */
function* rules(regions: readonly string[]): Generator<Hold> {
  yield holdAll;
  const everywhere = (seenMin: number) => Object.fromEntries(regions.map((id) => [id, seenMin]));
  yield { seenMin: everywhere(2), relevanceMin: 0.2, sparesNew: true };
  for (const [before, seenMin] of [
    [1, 2],
    [2, 3],
    [3, 4],
    [4, 6],
    [6, 8],
    [8, 16],
    [16, 32],
  ] as const) {
    for (let n = 1; n <= regions.length; n++) {
      const raised = Object.fromEntries(regions.map((id, i) => [id, i < n ? seenMin : before]));
      yield { seenMin: raised, relevanceMin: seenMin < 3 ? 0.2 : 0.5, sparesNew: false };
    }
  }
}

/** What is known of each token of a region, by row. */
interface Tokens {
  /** D, by weight. */
  readonly seen: Float64Array;
  /** Largest posterior probability, over the readings, that its rate depends on the queue. */
  readonly relevance: Float64Array;
  /** Newest epoch in which it was seen. */
  readonly lastSeen: Float64Array;
}

/** The most lenient rule under which a table of these counts keeps to `tableBytesPerQueueMax`. `projected` are the counts by
 *  queue, `counts` the same by queue and epoch. O(cells). */
export function chooseHold(counts: Counts, projected: Counts, fit: Fit, referenceEpoch: number): Hold {
  const bytesMax = bounds.tableBytesPerQueueMax * Math.max(bounds.tableQueuesMin, projected.columns.length);
  if (sum(projected.regions.map((region) => bytesOf(region, () => true))) <= bytesMax) return holdAll;
  const ids = projected.schema.regions.map(({ id }) => id);
  const bySize = [...ids.keys()].sort(
    (a, b) => projected.regions[b].tokens.length - projected.regions[a].tokens.length,
  );
  const tokens = describeTokens(counts, projected, fit);
  let strictest = holdAll;
  for (const hold of rules(bySize.map((g) => ids[g]))) {
    strictest = hold;
    const bytes = projected.regions.map((r, g) =>
      bytesOf(r, (i) => isHeld(hold, ids[g], tokens[g], i, referenceEpoch)),
    );
    if (sum(bytes) <= bytesMax) break;
  }
  return strictest;
}

/** The counts with only the tokens held; totals stay, so that rates stay what they were. `dropped` are frequent tokens that
 *  were dropped, ascending: a later entry must not take one for new. */
export function applyHold(
  counts: Counts,
  projected: Counts,
  fit: Fit,
  referenceEpoch: number,
): { readonly held: Counts; readonly dropped: readonly Float64Array[] } {
  if (Object.keys(fit.hold.seenMin).length === 0 && fit.hold.relevanceMin === 0) {
    return { held: projected, dropped: projected.regions.map(() => new Float64Array(0)) };
  }
  const tokens = describeTokens(counts, projected, fit);
  const dropped: Float64Array[] = [];
  const regions = projected.regions.map((region, g) => {
    const kept: number[] = [];
    const gone: number[] = [];
    for (let i = 0; i < region.tokens.length; i++) {
      if (isHeld(fit.hold, projected.schema.regions[g].id, tokens[g], i, referenceEpoch)) kept.push(i);
      else if (tokens[g].seen[i] >= bounds.droppedSeenMin) gone.push(region.tokens[i]);
    }
    dropped.push(Float64Array.from(gone));
    return pickTokens(region, kept);
  });
  return { held: { ...projected, regions }, dropped };
}

function isHeld(
  hold: Hold,
  region: string,
  { seen, relevance, lastSeen }: Tokens,
  i: number,
  referenceEpoch: number,
): boolean {
  if (seen[i] >= (hold.seenMin[region] ?? 0) && relevance[i] >= hold.relevanceMin) return true;
  return hold.sparesNew && lastSeen[i] > referenceEpoch - bounds.newTokenEpochs;
}

function describeTokens(counts: Counts, projected: Counts, fit: Fit): Tokens[] {
  return projected.regions.map((region, g) => ({
    ...weighTokens(region, projected, readingsOf(fit, projected.schema.regions[g].id)),
    lastSeen: newestEpochs(counts, g, region.tokens),
  }));
}

/** D and relevance of each row. Rows of one kind are weighed once. */
function weighTokens(
  region: RegionCounts,
  projected: Counts,
  readings: readonly Reading[],
): Pick<Tokens, 'seen' | 'relevance'> {
  const queues = projected.columns.length;
  const same = Int32Array.from({ length: queues }, (_, k) => k);
  const exposures = readings.map((reading) =>
    exposureOf(reading, reading.draws === 'tokens' ? region.total : projected.messages, region.tokens.length),
  );
  const hits = createHits(queues);
  const seen = new Float64Array(region.tokens.length);
  const relevance = new Float64Array(region.tokens.length);
  const byKind = new Map<number, number>();
  for (let i = 0; i < region.tokens.length; i++) {
    readHits(region, same, i, null, hits);
    seen[i] = hits.seen;
    const kind = kindOf(hits, queues);
    relevance[i] =
      byKind.get(kind) ?? Math.max(0, ...exposures.map((e) => 1 - (weighModels(e, hits).at(-1) as number)));
    if (kind >= 0) byKind.set(kind, relevance[i]);
  }
  return { seen, relevance };
}

function readingsOf(fit: Fit, region: string): Reading[] {
  const distinct = new Map<string, Reading>();
  for (const block of fit.blocks) {
    if (block.kind === 'tokens' && block.region === region)
      distinct.set(`${block.draws} ${block.concentrations}`, block);
  }
  return [...distinct.values()];
}

/** Newest epoch of each of `tokens`, which are ascending and among the region's. */
function newestEpochs(counts: Counts, g: number, tokens: Float64Array): Float64Array {
  const { start, column, tokens: all } = counts.regions[g];
  const newest = new Float64Array(tokens.length);
  for (let i = 0, n = 0; n < tokens.length; i++) {
    if (all[i] !== tokens[n]) continue;
    for (let p = start[i]; p < start[i + 1]; p++)
      newest[n] = Math.max(newest[n], counts.columns[column[p]].epoch);
    n++;
  }
  return newest;
}

/** About what the rows take when encoded (see codec-counts): 4 bytes a hash, as long as a region holds 4 thousand to 500
 *  thousand; for each cell its column, and its count when that is not 1. */
function bytesOf({ tokens, start, column, count }: RegionCounts, isKept: (row: number) => boolean): number {
  let bytes = 0;
  for (let i = 0; i < tokens.length; i++) {
    if (!isKept(i)) continue;
    bytes += 4;
    for (let p = start[i]; p < start[i + 1]; p++)
      bytes += (column[p] < 32 ? 1 : 2) + (count[p] === 1 ? 0 : Number.isInteger(count[p]) ? 1 : 2);
  }
  return bytes;
}

function sum(values: readonly number[]): number {
  return values.reduce((a, b) => a + b, 0);
}
