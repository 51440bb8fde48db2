import type { Schema } from '../features/schema.ts';
import type { Column, Counts } from './counts.ts';
import { defaultFit, type Fit } from './fit.ts';
import { emptyCounts, remapCounts } from './fold.ts';
import { applyHold } from './prune.ts';

/** What routers load: the counts by queue, aged to the newest epoch, with what was fitted from them. */
export interface ServedTable {
  /** One column a queue, its epoch 0. */
  readonly counts: Counts;
  /** Newest epoch of the counts it was made from; weights are relative to it. */
  readonly referenceEpoch: number;
  readonly halfLifeDays: number | null;
  /** Distinct tokens of each region before pruning; [regions]. */
  readonly vocabulary: readonly number[];
  /** Frequent tokens that were pruned since they say nothing of the queue; ascending; [regions]. They score 0 and are not
   *  taken for new when a later entry holds them. */
  readonly pruned: readonly Float64Array[];
  readonly fit: Fit;
}

export interface ServeOptions {
  readonly halfLifeDays: number | null;
}

/** Aged counts are whole multiples of 1/weightUnit, so that they add exactly and Σ_v d = c holds exactly after ageing:
 *  every cell of a column is multiplied by the same whole number. Counts older than ten half-lives round to nothing. */
export const weightUnit = 1024;

/** Weight of an epoch: 2^(-(E - epoch)·7/halfLifeDays), a multiple of 1/weightUnit; 1 when nothing ages. */
export function weightOf(epoch: number, referenceEpoch: number, halfLifeDays: number | null): number {
  if (halfLifeDays === null) return 1;
  return Math.round(weightUnit * 2 ** (((epoch - referenceEpoch) * 7) / halfLifeDays)) / weightUnit;
}

export function emptyTable(schema: Schema): ServedTable {
  return serve(emptyCounts(schema), defaultFit(schema), { halfLifeDays: null });
}

/** The table that routers load, made from the counts of all epochs, with the tokens that `fit.hold` holds. O(cells). */
export function serve(counts: Counts, fit: Fit, { halfLifeDays }: ServeOptions): ServedTable {
  const { projected, referenceEpoch } = project(counts, halfLifeDays);
  const { held, dropped } = applyHold(counts, projected, fit, referenceEpoch);
  return {
    counts: held,
    referenceEpoch,
    halfLifeDays,
    vocabulary: projected.regions.map((r) => r.tokens.length),
    pruned: dropped,
    fit,
  };
}

/** Counts summed over epochs, each with its weight. */
export function project(
  counts: Counts,
  halfLifeDays: number | null,
): { readonly projected: Counts; readonly referenceEpoch: number } {
  const referenceEpoch = counts.columns.reduce((newest, c) => Math.max(newest, c.epoch), 0);
  const weight = Float64Array.from(counts.columns, (c) => weightOf(c.epoch, referenceEpoch, halfLifeDays));
  const target = counts.columns.map((c): Column => ({ queue: c.queue, epoch: 0 }));
  return { projected: remapCounts(counts, target, weight), referenceEpoch };
}
