import type { Column, Counts, CountsView, RegionCounts } from './counts.ts';
import { remapCounts } from './fold.ts';
import type { Hits } from './hits.ts';
import { Numbers } from './numbers.ts';
import { rowCount, rowsOf } from './rows.ts';
import { addToRow } from './sparse.ts';

/** Aged counts are whole multiples of 1/weightUnit, so that they add exactly and Σ_v d = c holds exactly after ageing:
 *  every cell of a column is multiplied by the same whole number. Counts older than ten half-lives round to nothing. */
export const weightUnit = 1024;

/** Weight of an epoch: 2^(-(E - epoch)·7/halfLifeDays), a multiple of 1/weightUnit; 1 when nothing ages. */
export function weightOf(epoch: number, referenceEpoch: number, halfLifeDays: number | null): number {
  if (halfLifeDays === null) return 1;
  return Math.round(weightUnit * 2 ** (((epoch - referenceEpoch) * 7) / halfLifeDays)) / weightUnit;
}

/** Counts summed over epochs, each with its weight: all but the tokens, of which only the sums stand here. */
export interface Projection {
  /** One column a queue, its epoch 0. */
  readonly head: Omit<Counts, 'regions'>;
  /** [regions][queues]. */
  readonly totals: readonly Float64Array[];
  /** Newest epoch; weights are relative to it. */
  readonly referenceEpoch: number;
  /** Of the counts' columns, to the queue's: -1 where the weight is nothing. */
  readonly to: Int32Array;
  readonly weight: Float64Array;
}

export function projectionOf(counts: CountsView, halfLifeDays: number | null): Projection {
  const { columns, schema } = counts;
  const referenceEpoch = columns.reduce((newest, c) => Math.max(newest, c.epoch), 0);
  const weight = Float64Array.from(columns, (c) => weightOf(c.epoch, referenceEpoch, halfLifeDays));
  const target = columns.map((c): Column => ({ queue: c.queue, epoch: 0 }));
  const { regions: _, ...head } = remapCounts({ ...counts, regions: [] }, target, weight);
  const queues = head.columns.map((c) => c.queue);
  const to = Int32Array.from(columns, ({ queue }, c) => (weight[c] > 0 ? queues.indexOf(queue) : -1));
  const totals = schema.regions.map((_, g) => {
    const total = new Float64Array(queues.length);
    counts.regions[g].total.forEach((value, c) => {
      if (to[c] >= 0) total[to[c]] += value * weight[c];
    });
    return total;
  });
  return { head, totals, referenceEpoch, to, weight };
}

/** A token of the projection. */
export interface ProjectedRow {
  readonly token: number;
  /** By queue, ascending. */
  readonly hits: Hits;
  /** Newest epoch in which it was seen, whatever that weighs. */
  readonly lastSeen: number;
}

/** Calls `visit` for each token of a region that weighs anything, ascending. The row is good until `visit` returns. O(cells). */
export function visitRows(
  counts: CountsView,
  { to, weight, head }: Projection,
  g: number,
  visit: (row: ProjectedRow) => void,
): void {
  const queues = head.columns.length;
  const hits: Hits = { queue: new Uint32Array(queues), count: new Float64Array(queues), length: 0, seen: 0 };
  const row = { token: 0, hits, lastSeen: 0 };
  const { queue, count } = hits;
  const rows = rowsOf(counts.regions[g]);
  const epoch = Float64Array.from(counts.columns, (c) => c.epoch);
  const { column, count: counted } = rows;
  while (rows.next()) {
    let length = 0;
    let seen = 0;
    let lastSeen = 0;
    for (let p = rows.from; p < rows.to; p++) {
      const c = column[p];
      if (epoch[c] > lastSeen) lastSeen = epoch[c];
      const k = to[c];
      if (k < 0) continue;
      const value = counted[p] * weight[c];
      seen += value;
      length = addToRow(queue, count, 0, length, k, value);
    }
    if (length === 0) continue;
    row.token = rows.token;
    hits.length = length;
    hits.seen = seen;
    row.lastSeen = lastSeen;
    visit(row);
  }
}

/** Distinct tokens of each region in the projection; [regions]. */
export function vocabularyOf(counts: CountsView, projection: Projection): number[] {
  return counts.regions.map((region, g) => {
    if (!projection.to.includes(-1)) return rowCount(region);
    let tokens = 0;
    visitRows(counts, projection, g, () => tokens++);
    return tokens;
  });
}

/** The projection's rows of a region for which `isKept`. */
export function projectRegion(
  counts: CountsView,
  projection: Projection,
  g: number,
  isKept: (row: ProjectedRow) => boolean,
): RegionCounts {
  const [tokens, start, column, count] = [
    new Numbers(Float64Array),
    new Numbers(Uint32Array),
    new Numbers(Uint32Array),
    new Numbers(Float64Array),
  ];
  start.push(0);
  visitRows(counts, projection, g, (row) => {
    if (!isKept(row)) return;
    const { hits } = row;
    tokens.push(row.token);
    for (let h = 0; h < hits.length; h++) {
      column.push(hits.queue[h]);
      count.push(hits.count[h]);
    }
    start.push(column.length);
  });
  return {
    tokens: tokens.taken(),
    start: start.taken(),
    column: column.taken(),
    count: count.taken(),
    total: projection.totals[g],
  };
}
