import type { Features, Schema } from '../features/schema.ts';
import type { Counts, Entry, RegionCounts } from './counts.ts';
import { type Block, type Fit, isIdle, type Reading, type TokensBlock } from './fit.ts';
import { addCounts, deltaOf } from './fold.ts';
import { pickTokens } from './prune.ts';
import { exposureOf } from './rates.ts';
import { type ServedTable, weightOf } from './served-table.ts';
import { indexOfToken } from './sparse.ts';
import { createView, type View } from './view.ts';

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
  /** Tokens held by fewer messages score nothing. */
  readonly seenMin: number;
}

export interface ScorerReading {
  /** Blocks that sum contributions of this reading, with their place in the fit. */
  readonly blocks: readonly { readonly index: number; readonly part: TokensBlock['part'] }[];
  /** Whether absence is evidence: some block asks for it, and messages are drawn (a message draws no absent token). */
  readonly countsAbsent: boolean;
  readonly view: View;
  /** Views without one message of a queue, by queue and weight; filled as leave-one-out scores need them. */
  readonly leaving: Map<string, View>;
}

export interface ScorerOptions {
  /** Scores blocks with an exponent of 0 too. */
  readonly isForFit?: boolean;
  /** Tokens held by fewer messages are scored as if the table did not hold them; by region id. */
  readonly seenMin?: Readonly<Record<string, number>>;
}

/** Compiles a served table with the entries that came after it. Queues without a column have counts of zero; columns of
 *  queues that are not listed are left out of all sums. O(cells + entries). */
export function createScorer(
  table: ServedTable,
  overlay: readonly Entry[],
  queues: readonly string[],
  halfLifeDays: number | null,
  { isForFit = false, seenMin = {} }: ScorerOptions = {},
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
  const regions = counts.regions.map((region, g) => ({
    counts: region,
    pruned: table.pruned[g],
    queueOf,
    seenMin: seenMin[schema.regions[g].id] ?? 0,
  }));
  const readings = schema.regions.map(({ id }, g) => {
    const draws = { tokens: byQueue(counts.regions[g].total), messages };
    const added = counts.regions[g].tokens.length - table.counts.regions[g].tokens.length;
    return readingsOf(table.fit.blocks, id, isForFit).map(({ reading, blocks }) => {
      const exposure = exposureOf(reading, draws[reading.draws], table.vocabulary[g] + added);
      const countsAbsent =
        reading.draws === 'messages' && blocks.some((b) => b.part === 'all' || b.part === 'absent');
      return {
        blocks,
        countsAbsent,
        view: createView(regions[g], exposure, countsAbsent),
        leaving: new Map(),
      };
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

function readingsOf(
  blocks: readonly Block[],
  region: string,
  isForFit: boolean,
): { reading: Reading; blocks: ScorerReading['blocks'] }[] {
  const found = new Map<
    string,
    { reading: Reading; blocks: { index: number; part: TokensBlock['part'] }[] }
  >();
  blocks.forEach((block, index) => {
    if (block.kind !== 'tokens' || block.region !== region || (isIdle(block) && !isForFit)) return;
    const key = `${block.draws} ${block.pooledRate} ${block.concentrations.join()}`;
    const same = found.get(key);
    if (same) same.blocks.push({ index, part: block.part });
    else found.set(key, { reading: block, blocks: [{ index, part: block.part }] });
  });
  return [...found.values()];
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
