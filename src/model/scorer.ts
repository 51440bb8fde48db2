import type { Schema } from '../features/schema.ts';
import { closedScores } from './closed-scores.ts';
import type { Counts, Entry, RegionCounts } from './counts.ts';
import { type Block, exponentOf, type Fit, isIdle, type Reading, type TokensBlock } from './fit.ts';
import { deltaOf } from './fold.ts';
import { weightOf } from './projection.ts';
import { exposureOf } from './rates.ts';
import { countAdded, createRegion, type ScorerRegion } from './scorer-region.ts';
import type { ServedTable } from './served-table.ts';
import { indexOfToken, remapRegion } from './sparse.ts';
import { createTokenScores, type TokenScores } from './token-scores.ts';
import { createView, type View } from './view.ts';

export type { ScorerRegion };

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
  /** What each value of a slot adds to the log posterior, exponents included; [slots][values * queues]. */
  readonly slotScores: readonly Float64Array[];
  /** What prior and biases add; [queues]. */
  readonly priorScores: Float64Array;
  readonly tokenScores: readonly TokenScores[];
  /** What the absent tokens of a region add before length scaling; [regions][queues]. */
  readonly absentScores: readonly Float64Array[];
}

/** A block of the fit that takes a part of a reading's sums. */
export interface PartBlock {
  /** Its place in the fit. */
  readonly index: number;
  readonly part: TokensBlock['part'];
  /** [queues]. */
  readonly exponents: Float64Array;
}

export interface ScorerReading {
  /** Blocks that sum contributions of this reading, with their place in the fit. */
  readonly blocks: readonly PartBlock[];
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
  const { schema } = table.counts;
  const change = overlay.length === 0 ? null : changeOf(table, overlay, halfLifeDays);
  const columns = [...table.counts.columns.map((c) => c.queue)];
  for (const { queue } of change?.columns ?? []) if (!columns.includes(queue)) columns.push(queue);
  const queueOf = Int32Array.from(columns, (queue) => queues.indexOf(queue));
  const toColumn = change?.columns.map((c) => columns.indexOf(c.queue)) ?? [];
  /** The table's values and the change's, by open queue; not below nothing. */
  const byQueue = (values: Float64Array, more: Float64Array | undefined): Float64Array => {
    const out = new Float64Array(queues.length);
    values.forEach((value, c) => {
      if (queueOf[c] >= 0) out[queueOf[c]] += value;
    });
    more?.forEach((value, c) => {
      if (queueOf[toColumn[c]] >= 0) out[queueOf[toColumn[c]]] += value;
    });
    return out.map((value) => Math.max(0, value));
  };
  const messages = byQueue(table.counts.messages, change?.messages);
  const slots = schema.slots.map(({ values }, j) => {
    const out = new Float64Array(values.length * queues.length);
    const rowsOf = (counts: Counts, v: number) =>
      counts.slots[j].subarray(v * counts.columns.length, (v + 1) * counts.columns.length);
    for (let v = 0; v < values.length; v++) {
      out.set(
        byQueue(rowsOf(table.counts, v), change === null ? undefined : rowsOf(change, v)),
        v * queues.length,
      );
    }
    return out;
  });
  const ones = new Float64Array(toColumn.length).fill(1);
  const regions = schema.regions.map(({ id }, g) => {
    const later = change === null ? null : remapRegion(change.regions[g], toColumn, ones, columns.length);
    const base = padded(table.counts.regions[g], columns.length);
    return createRegion(base, later, queueOf, table.pruned[g], seenMin[id] ?? 0);
  });
  const readings = schema.regions.map(({ id }, g) => {
    const draws = { tokens: byQueue(table.counts.regions[g].total, change?.regions[g].total), messages };
    const vocabulary = table.vocabulary[g] + countAdded(regions[g]);
    return readingsOf(table.fit.blocks, id, queues, isForFit).map(({ reading, blocks }) => {
      const exposure = exposureOf(reading, draws[reading.draws], vocabulary);
      const countsAbsent =
        reading.draws === 'messages' && blocks.some((b) => b.part === 'all' || b.part === 'absent');
      const view = createView(regions[g], exposure, countsAbsent);
      return { blocks, countsAbsent, view, leaving: new Map() };
    });
  });
  const tokenScores = regions.map((region) => createTokenScores(region, queues.length));
  const counted = { schema, queues, fit: table.fit, messages, slots, regions, readings, tokenScores };
  return {
    ...counted,
    ...closedScores(counted),
    absentScores: readings.map((all) => absentScores(all, queues.length)),
  };
}

/** The change that later entries make to a table, by queue. */
function changeOf(table: ServedTable, overlay: readonly Entry[], halfLifeDays: number | null): Counts {
  return deltaOf(table.counts.schema, overlay, ({ queue, epoch }) => ({
    column: { queue, epoch: 0 },
    weight: weightOf(epoch, table.referenceEpoch, halfLifeDays),
  }));
}

/** The region with totals for further columns. */
function padded(region: RegionCounts, columns: number): RegionCounts {
  if (region.total.length === columns) return region;
  const total = new Float64Array(columns);
  total.set(region.total);
  return { ...region, total };
}

function absentScores(readings: readonly ScorerReading[], queues: number): Float64Array {
  const sum = new Float64Array(queues);
  for (const { view, blocks } of readings) {
    for (const { part, exponents } of blocks) {
      if (view.absent === null || (part !== 'all' && part !== 'absent')) continue;
      for (let k = 0; k < queues; k++) sum[k] += exponents[k] * view.absent[k];
    }
  }
  return sum;
}

function readingsOf(
  blocks: readonly Block[],
  region: string,
  queues: readonly string[],
  isForFit: boolean,
): { readonly reading: Reading; readonly blocks: readonly PartBlock[] }[] {
  const found = new Map<string, { reading: Reading; blocks: PartBlock[] }>();
  blocks.forEach((block, index) => {
    if (block.kind !== 'tokens' || block.region !== region || (isIdle(block) && !isForFit)) return;
    const key = `${block.draws} ${block.pooledRate} ${block.concentrations.join()}`;
    const exponents = Float64Array.from(queues, (queue) => exponentOf(block, queue));
    const part = { index, part: block.part, exponents };
    const same = found.get(key);
    if (same) same.blocks.push(part);
    else found.set(key, { reading: block, blocks: [part] });
  });
  return [...found.values()];
}

/** Row of a token in `region.counts`, or -1 when it was never seen or was pruned. */
export function rowOf(region: ScorerRegion, token: number): number {
  return indexOfToken(region.counts.tokens, token);
}
