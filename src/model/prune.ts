import { bounds } from '../bounds.ts';
import type { Counts, RegionCounts } from './counts.ts';
import type { Fit, Hold, Reading } from './fit.ts';
import { createHits, kindOf, readHits } from './hits.ts';
import { exposureOf, weighModels } from './rates.ts';

export const holdAll: Hold = { seenMin: 0, relevanceMin: 0, sparesNew: true };

/** From lenient to strict; the first under which the table fits its bound is taken. Tokens seen once go before others, since
 *  they are half of all and tell little; then those whose rate hardly depends on the queue. */
const levels: readonly Hold[] = [
  holdAll,
  { seenMin: 2, relevanceMin: 0.2, sparesNew: true },
  { seenMin: 2, relevanceMin: 0.2, sparesNew: false },
  { seenMin: 2, relevanceMin: 0.5, sparesNew: false },
  { seenMin: 3, relevanceMin: 0.5, sparesNew: false },
  { seenMin: 4, relevanceMin: 0.5, sparesNew: false },
  { seenMin: 6, relevanceMin: 0.5, sparesNew: false },
  { seenMin: 8, relevanceMin: 0.7, sparesNew: false },
  { seenMin: 16, relevanceMin: 0.9, sparesNew: false },
];

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
  const tokens = describeTokens(counts, projected, fit);
  const fits = (hold: Hold) =>
    sum(projected.regions.map((r, g) => bytesOf(r, (i) => isHeld(hold, tokens[g], i, referenceEpoch)))) <=
    bytesMax;
  return levels.find(fits) ?? levels[levels.length - 1];
}

/** The counts with only the tokens held; totals stay, so that rates stay what they were. `dropped` are frequent tokens that
 *  were dropped, ascending: a later entry must not take one for new. */
export function applyHold(
  counts: Counts,
  projected: Counts,
  fit: Fit,
  referenceEpoch: number,
): { readonly held: Counts; readonly dropped: readonly Float64Array[] } {
  if (fit.hold.seenMin === 0 && fit.hold.relevanceMin === 0) {
    return { held: projected, dropped: projected.regions.map(() => new Float64Array(0)) };
  }
  const tokens = describeTokens(counts, projected, fit);
  const dropped: Float64Array[] = [];
  const regions = projected.regions.map((region, g) => {
    const kept: number[] = [];
    const gone: number[] = [];
    for (let i = 0; i < region.tokens.length; i++) {
      if (isHeld(fit.hold, tokens[g], i, referenceEpoch)) kept.push(i);
      else if (tokens[g].seen[i] >= bounds.droppedSeenMin) gone.push(region.tokens[i]);
    }
    dropped.push(Float64Array.from(gone));
    return pickTokens(region, kept);
  });
  return { held: { ...projected, regions }, dropped };
}

function isHeld(
  hold: Hold,
  { seen, relevance, lastSeen }: Tokens,
  i: number,
  referenceEpoch: number,
): boolean {
  if (seen[i] >= hold.seenMin && relevance[i] >= hold.relevanceMin) return true;
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

function sum(values: readonly number[]): number {
  return values.reduce((a, b) => a + b, 0);
}
