import type { Features, Schema } from '../features/schema.ts';
import type { Counts, Entry, RegionCounts } from './counts.ts';
import type { Block, Fit, Reading, TokensBlock } from './fit.ts';
import { addCounts, deltaOf } from './fold.ts';
import { type Exposure, exposureOf, type Hits, pooledRate, rateRatios } from './rates.ts';
import { type ServedTable, weightOf } from './served-table.ts';
import { indexOfToken } from './sparse.ts';

/** A table made ready to score messages for a list of queues. Immutable to its users: what it remembers between calls are
 *  values that follow from the table alone. */
export interface Scorer {
  readonly schema: Schema;
  /** Open queues, in the desk's order. */
  readonly queues: readonly string[];
  readonly fit: Fit;
  /** c_k, confirmed messages; [queues]. */
  readonly messages: Float64Array;
  /** d; [slots][values * queues], value-major. */
  readonly slots: readonly Float64Array[];
  readonly regions: readonly ScorerRegion[];
  /** Distinct readings of the fit's blocks, by region. */
  readonly readings: readonly (readonly ScorerReading[])[];
}

export interface ScorerRegion {
  readonly counts: RegionCounts;
  readonly pruned: Float64Array;
  /** Table column to queue, -1 for a queue that is not open; [columns]. */
  readonly queueOf: Int32Array;
}

export interface ScorerReading {
  readonly exposure: Exposure;
  /** Blocks that sum contributions of this reading, with their place in the fit. */
  readonly blocks: readonly { readonly index: number; readonly part: TokensBlock['part'] }[];
  /** Whether absence is evidence: some block asks for it, and messages are drawn (a message draws no absent token). */
  readonly countsAbsent: boolean;
  /** Σ_t log((1 - p_kt)/(1 - m_t)) over all tokens held, as if none were present; [queues]. */
  readonly absent: Float64Array;
  /** The same without one message of a queue, by queue and weight; filled as leave-one-out scores need it. */
  readonly absentLeaving: Map<string, Float64Array>;
  /** Logs of rows that were scored before, by row. */
  readonly remembered: Map<number, TokenLogs>;
}

/** What a token adds: log p_k/m when present, log (1 - p_k)/(1 - m) when absent (null where that is not counted); [queues]. */
export interface TokenLogs {
  readonly present: Float64Array;
  readonly absent: Float64Array | null;
}

/** Compiles a served table with the entries that came after it. Queues without a column have counts of zero; columns of
 *  queues that are not listed are left out of all sums. O(cells + entries). */
export function createScorer(
  table: ServedTable,
  overlay: readonly Entry[],
  queues: readonly string[],
  halfLifeDays: number | null,
): Scorer {
  const counts = overlayEntries(table, overlay, halfLifeDays);
  const { schema } = counts;
  const index = new Map(queues.map((queue, k) => [queue, k]));
  const queueOf = Int32Array.from(counts.columns, (c) => index.get(c.queue) ?? -1);
  const byQueue = (values: Float64Array): Float64Array => {
    const out = new Float64Array(queues.length);
    for (let c = 0; c < queueOf.length; c++) if (queueOf[c] >= 0) out[queueOf[c]] += values[c];
    return out;
  };
  const columns = queueOf.length;
  const messages = byQueue(counts.messages);
  const slots = counts.slots.map((d, j) => {
    const out = new Float64Array(schema.slots[j].values.length * queues.length);
    for (let v = 0; v < schema.slots[j].values.length; v++) {
      out.set(byQueue(d.subarray(v * columns, (v + 1) * columns)), v * queues.length);
    }
    return out;
  });
  const regions = counts.regions.map((region, g) => ({ counts: region, pruned: table.pruned[g], queueOf }));
  const readings = schema.regions.map(({ id }, g) => {
    const draws = { tokens: byQueue(counts.regions[g].total), messages };
    const added = counts.regions[g].tokens.length - table.counts.regions[g].tokens.length;
    return readingsOf(table.fit.blocks, id).map(({ reading, blocks }) => {
      const exposure = exposureOf(reading, draws[reading.draws], table.vocabulary[g] + added);
      const countsAbsent =
        reading.draws === 'messages' && blocks.some((b) => b.part === 'all' || b.part === 'absent');
      const absent = countsAbsent ? absentSum(regions[g], exposure) : new Float64Array(queues.length);
      return { exposure, blocks, countsAbsent, absent, absentLeaving: new Map(), remembered: new Map() };
    });
  });
  return { schema, queues, fit: table.fit, messages, slots, regions, readings };
}

/** The table's counts with later entries added. A token that was pruned as irrelevant stays so; a cell that pruning took
 *  and that an entry now subtracts from stays zero. */
function overlayEntries(table: ServedTable, overlay: readonly Entry[], halfLifeDays: number | null): Counts {
  if (overlay.length === 0) return table.counts;
  const delta = deltaOf(table.counts.schema, overlay, ({ queue, epoch }) => ({
    column: { queue, epoch: 0 },
    weight: weightOf(epoch, table.referenceEpoch, halfLifeDays),
  }));
  const sum = addCounts(table.counts, delta, 'zero');
  return { ...sum, regions: sum.regions.map((region, g) => withoutTokens(region, table.pruned[g])) };
}

function withoutTokens(region: RegionCounts, dropped: Float64Array): RegionCounts {
  if (dropped.length === 0) return region;
  const kept: number[] = [];
  for (let i = 0, d = 0; i < region.tokens.length; i++) {
    while (d < dropped.length && dropped[d] < region.tokens[i]) d++;
    if (dropped[d] !== region.tokens[i]) kept.push(i);
  }
  if (kept.length === region.tokens.length) return region;
  return pickTokens(region, kept);
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

function readingsOf(
  blocks: readonly Block[],
  region: string,
): { reading: Reading; blocks: ScorerReading['blocks'] }[] {
  const found = new Map<
    string,
    { reading: Reading; blocks: { index: number; part: TokensBlock['part'] }[] }
  >();
  blocks.forEach((block, index) => {
    if (block.kind !== 'tokens' || block.region !== region) return;
    const key = `${block.draws} ${block.pooledRate} ${block.concentrations.join()}`;
    const same = found.get(key);
    if (same) same.blocks.push({ index, part: block.part });
    else found.set(key, { reading: block, blocks: [{ index, part: block.part }] });
  });
  return [...found.values()];
}

export function createHits(queues: number): Hits {
  return { queue: new Uint32Array(queues), count: new Float64Array(queues), length: 0, seen: 0 };
}

/** The counts of row i by queue; `own` of them (of weight `weight`) left out. */
export function readHits(region: ScorerRegion, i: number, own: number, weight: number, hits: Hits): void {
  const { start, column, count } = region.counts;
  hits.length = 0;
  hits.seen = 0;
  for (let p = start[i]; p < start[i + 1]; p++) {
    const k = region.queueOf[column[p]];
    if (k < 0) continue;
    const left = k === own ? count[p] - weight : count[p];
    if (left <= 0) continue;
    hits.queue[hits.length] = k;
    hits.count[hits.length++] = left;
    hits.seen += left;
  }
}

/** No more hits than draws. They can only be more where a message's draw was taken out and a token was in every message of
 *  its queue, that message included; such a token is corrected for by whoever took the draw out. */
export function clampHits(hits: Hits, exposure: Exposure): void {
  hits.seen = 0;
  for (let h = 0; h < hits.length; h++) {
    hits.count[h] = Math.min(hits.count[h], exposure.draws[hits.queue[h]]);
    hits.seen += hits.count[h];
  }
}

/** Σ_t log((1 - p_kt)/(1 - m_t)) over all tokens of a region. Tokens seen once or twice, most of all, fall into few kinds
 *  that add the same; of the others the factors are multiplied, and a logarithm is taken only when the product nears the end
 *  of the range. O(cells + tokens · queues). Shape: [queues]. */
export function absentSum(region: ScorerRegion, exposure: Exposure): Float64Array {
  const queues = exposure.draws.length;
  const hits = createHits(queues);
  const product = new Float64Array(queues).fill(1);
  const sum = new Float64Array(queues);
  const kinds = new Map<number, { readonly factor: Float64Array; times: number }>();
  for (let i = 0; i < region.counts.tokens.length; i++) {
    readHits(region, i, -1, 0, hits);
    if (hits.length === 0) continue;
    const kind = kindOf(hits, queues);
    const same = kind < 0 ? undefined : kinds.get(kind);
    if (same) {
      same.times++;
      continue;
    }
    clampHits(hits, exposure);
    const factor = absentFactors(exposure, hits);
    if (kind >= 0) {
      kinds.set(kind, { factor, times: 1 });
      continue;
    }
    for (let k = 0; k < queues; k++) {
      product[k] *= factor[k];
      if (product[k] > 1e200 || product[k] < 1e-200) {
        sum[k] += Math.log(product[k]);
        product[k] = 1;
      }
    }
  }
  for (const { factor, times } of kinds.values())
    for (let k = 0; k < queues; k++) sum[k] += times * Math.log(factor[k]);
  return sum.map((s, k) => s + Math.log(product[k]));
}

/** (1 - p_k)/(1 - m); [queues]. */
export function absentFactors(exposure: Exposure, hits: Hits): Float64Array {
  const factors = new Float64Array(exposure.draws.length);
  rateRatios(exposure, hits, factors);
  const m = pooledRate(exposure, hits.seen);
  for (let k = 0; k < factors.length; k++) factors[k] = (1 - factors[k] * m) / (1 - m);
  return factors;
}

/** Which queues hold the one or two sightings of a token; -1 for any other token. */
function kindOf({ seen, length, queue, count }: Hits, queues: number): number {
  if (seen === 1 && length === 1) return queue[0];
  if (seen !== 2 || (length === 2 && count[0] !== 1)) return -1;
  const [a, b] =
    length === 1 ? [queue[0], queue[0]] : [Math.min(queue[0], queue[1]), Math.max(queue[0], queue[1])];
  return queues * (1 + a) + b;
}

/** Where a token stands in a region: its row, or -1 when it was never seen or was pruned. */
export function rowOf(region: ScorerRegion, token: number): number {
  return indexOfToken(region.counts.tokens, token);
}

/** Distinct tokens of a message, and how many of them the table knows, those included that it knows to say nothing. */
export function countTokens(
  scorer: Scorer,
  features: Features,
): { readonly tokens: number; readonly knownTokens: number } {
  let tokens = 0;
  let knownTokens = 0;
  features.regions.forEach((present, g) => {
    tokens += present.length;
    const { counts, pruned } = scorer.regions[g];
    for (const token of present) {
      if (indexOfToken(counts.tokens, token) >= 0 || indexOfToken(pruned, token) >= 0) knownTokens++;
    }
  });
  return { tokens, knownTokens };
}
