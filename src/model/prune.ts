import { bounds } from '../bounds.ts';
import type { CountsView, RegionCounts } from './counts.ts';
import type { Fit, Hold, Reading } from './fit.ts';
import { type Hits, kindOf } from './hits.ts';
import { Numbers } from './numbers.ts';
import { type Projection, projectRegion, visitRows } from './projection.ts';
import { exposureOf, weighModels } from './rates.ts';

export const holdAll: Hold = { seenMin: {}, relevanceMin: 0, sparesNew: true };

/** How often a token must have been seen, by rule: each step of the rules goes from one to the next. The last are for tables of a
 *  million messages. */
const seenSteps = [1, 2, 3, 4, 6, 8, 16, 32, 64, 128, 256, 512, 1024, 2048, 4096] as const;
const relevanceSteps = [0, 0.2, 0.5] as const;

/** Rules from lenient to strict. First go old tokens that were seen once or hardly depend on the queue; then tokens seen once,
 *  which are half of all and tell little, from the regions that hold most of them down to those that hold few; then ever
 *  more frequent ones. `regions` by falling number of tokens. */
function* rules(regions: readonly string[]): Generator<Hold> {
  yield holdAll;
  const everywhere = (seenMin: number) => Object.fromEntries(regions.map((id) => [id, seenMin]));
  yield { seenMin: everywhere(2), relevanceMin: 0.2, sparesNew: true };
  for (let step = 1; step < seenSteps.length; step++) {
    const [before, seenMin] = [seenSteps[step - 1], seenSteps[step]];
    for (let n = 1; n <= regions.length; n++) {
      const raised = Object.fromEntries(regions.map((id, i) => [id, i < n ? seenMin : before]));
      yield { seenMin: raised, relevanceMin: seenMin < 3 ? 0.2 : 0.5, sparesNew: false };
    }
  }
}

/** Largest posterior probability, over the readings, that a token's rate depends on the queue. */
type Relevance = (hits: Hits) => number;

/** The most lenient rule under which a table of these counts keeps to `tableBytesPerQueueMax`; `vocabulary` are the distinct tokens
 *  of each region. Two looks at each token, O(cells). */
export function chooseHold(
  counts: CountsView,
  projection: Projection,
  vocabulary: readonly number[],
  fit: Fit,
): Hold {
  const { regions } = counts.schema;
  const bytesMax = tableBytesMax(projection);
  let whole = 0;
  for (const g of regions.keys())
    visitRows(counts, projection, g, ({ hits }) => {
      whole += bytesOf(hits);
    });
  if (whole <= bytesMax) return holdAll;
  const sizes = regions.map((_, g) => sizesOf(counts, projection, g, vocabulary[g], fit));
  const bySize = [...regions.keys()].sort((a, b) => vocabulary[b] - vocabulary[a]);
  let strictest = holdAll;
  for (const hold of rules(bySize.map((g) => regions[g].id))) {
    strictest = hold;
    const bytes = sizes.reduce((sum, sizeOf, g) => sum + sizeOf(hold, hold.seenMin[regions[g].id] ?? 0), 0);
    if (bytes <= bytesMax) break;
  }
  return strictest;
}

function tableBytesMax({ head }: Projection): number {
  return bounds.tableBytesPerQueueMax * Math.max(bounds.tableQueuesMin, head.columns.length);
}

/** Bytes of a region's tokens that a rule holds, told from sums by how often they were seen, relevance and novelty. */
function sizesOf(
  counts: CountsView,
  projection: Projection,
  g: number,
  vocabulary: number,
  fit: Fit,
): (hold: Hold, seenMin: number) => number {
  const relevanceOf = createRelevance(projection, g, vocabulary, fit);
  const bytes = new Float64Array((seenSteps.length + 1) * relevanceSteps.length * 2);
  const at = (seen: number, relevance: number, isNew: boolean) =>
    (seen * relevanceSteps.length + relevance) * 2 + (isNew ? 1 : 0);
  visitRows(counts, projection, g, ({ hits, lastSeen }) => {
    let seen = 0;
    while (seen < seenSteps.length && hits.seen >= seenSteps[seen]) seen++;
    const relevance = relevanceOf(hits);
    let step = 0;
    while (step + 1 < relevanceSteps.length && relevance >= relevanceSteps[step + 1]) step++;
    bytes[at(seen, step, isNew(projection, lastSeen))] += bytesOf(hits);
  });
  return ({ relevanceMin, sparesNew }, seenMin) => {
    let sum = 0;
    for (let seen = 0; seen <= seenSteps.length; seen++)
      for (const [step, relevance] of relevanceSteps.entries())
        for (const isFresh of [false, true]) {
          const isSeen = (seen === 0 ? 0 : seenSteps[seen - 1]) >= seenMin;
          if ((isSeen && relevance >= relevanceMin) || (sparesNew && isFresh))
            sum += bytes[at(seen, step, isFresh)];
        }
    return sum;
  };
}

/** The projection's tokens that are held; totals stay, so that rates stay what they were. `dropped` are frequent tokens that were
 *  dropped, ascending: a later entry must not take one for new. */
export function applyHold(
  counts: CountsView,
  projection: Projection,
  vocabulary: readonly number[],
  fit: Fit,
): { readonly regions: readonly RegionCounts[]; readonly dropped: readonly Float64Array[] } {
  const { hold } = fit;
  const holdsAll = Object.keys(hold.seenMin).length === 0 && hold.relevanceMin === 0;
  const dropped: Float64Array[] = [];
  const regions = counts.schema.regions.map(({ id }, g) => {
    const relevanceOf = createRelevance(projection, g, vocabulary[g], fit);
    const seenMin = hold.seenMin[id] ?? 0;
    const [gone, goneSeen] = [new Numbers(Float64Array), new Numbers(Float64Array)];
    const region = projectRegion(counts, projection, g, ({ token, hits, lastSeen }) => {
      if (holdsAll || (hold.sparesNew && isNew(projection, lastSeen))) return true;
      if (hits.seen >= seenMin && relevanceOf(hits) >= hold.relevanceMin) return true;
      if (hits.seen >= bounds.droppedSeenMin) {
        gone.push(token);
        goneSeen.push(hits.seen);
      }
      return false;
    });
    // Half as many bytes as the tokens held may take, shared by the regions.
    const listedMax = Math.floor(tableBytesMax(projection) / 2 / tokenBytes / counts.regions.length);
    dropped.push(mostSeen(gone.taken(), goneSeen.taken(), listedMax));
    return region;
  });
  return { regions, dropped };
}

/** The tokens if they are at most `max`; else those seen twice as often as the rarest, four times and so on, until they are. */
function mostSeen(tokens: Float64Array, seen: Float64Array, max: number): Float64Array {
  for (let seenMin: number = bounds.droppedSeenMin; ; seenMin *= 2) {
    const kept = seenMin === bounds.droppedSeenMin ? tokens : tokens.filter((_, i) => seen[i] >= seenMin);
    if (kept.length <= max) return kept;
  }
}

function isNew({ referenceEpoch }: Projection, lastSeen: number): boolean {
  return lastSeen > referenceEpoch - bounds.newTokenEpochs;
}

/** Tokens of one kind are weighed once. */
function createRelevance({ head, totals }: Projection, g: number, vocabulary: number, fit: Fit): Relevance {
  const queues = head.columns.length;
  const exposures = readingsOf(fit, head.schema.regions[g].id).map((reading) =>
    exposureOf(reading, reading.draws === 'tokens' ? totals[g] : head.messages, vocabulary),
  );
  const byKind = new Map<number, number>();
  return (hits) => {
    const kind = kindOf(hits, queues);
    const known = byKind.get(kind);
    if (known !== undefined) return known;
    let relevance = 0;
    for (const exposure of exposures)
      relevance = Math.max(relevance, 1 - (weighModels(exposure, hits).at(-1) as number));
    if (kind >= 0) byKind.set(kind, relevance);
    return relevance;
  };
}

function readingsOf(fit: Fit, region: string): Reading[] {
  const distinct = new Map<string, Reading>();
  for (const block of fit.blocks) {
    if (block.kind === 'tokens' && block.region === region)
      distinct.set(`${block.draws} ${block.concentrations}`, block);
  }
  return [...distinct.values()];
}

const tokenBytes = 4;

/** About what a token takes when encoded and not packed (see codec-counts), which is how the time to load grows: 4 bytes of its hash, as long as a region holds 4 thousand to 500
 *  thousand; for each cell its column, and its count when that is not 1. */
function bytesOf({ queue, count, length }: Hits): number {
  let bytes = tokenBytes;
  for (let h = 0; h < length; h++)
    bytes += (queue[h] < 32 ? 1 : 2) + (count[h] === 1 ? 0 : Number.isInteger(count[h]) ? 1 : 2);
  return bytes;
}
