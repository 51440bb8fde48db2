import type { Schema } from '../features/schema.ts';
import { type Bursts, noBursts } from './bursts.ts';
import type { Counts, CountsView } from './counts.ts';
import { defaultFit, type Fit } from './fit.ts';
import { emptyCounts } from './fold.ts';
import { type Projection, projectionOf, projectRegion, vocabularyOf } from './projection.ts';
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
  /** What was left out of the counts, so that no burst of one sender outweighs the rest. */
  readonly bursts: Bursts;
}

export interface ServeOptions {
  readonly halfLifeDays: number | null;
  /** What the counts were made without. */
  readonly bursts?: Bursts;
}

export function emptyTable(schema: Schema): ServedTable {
  return serve(emptyCounts(schema), defaultFit(schema), { halfLifeDays: null });
}

/** The table that routers load, made from the counts of all epochs, with the tokens that `fit.hold` holds. O(cells). */
export function serve(counts: CountsView, fit: Fit, { halfLifeDays, bursts }: ServeOptions): ServedTable {
  const projection = projectionOf(counts, halfLifeDays);
  const vocabulary = vocabularyOf(counts, projection);
  const { regions, dropped } = applyHold(counts, projection, vocabulary, fit);
  const { referenceEpoch, head } = projection;
  return {
    counts: { ...head, regions },
    referenceEpoch,
    halfLifeDays,
    vocabulary,
    pruned: dropped,
    fit,
    bursts: bursts ?? noBursts(counts.schema),
  };
}

/** The same with only those tokens that are among `wanted` [regions][ascending; null: all], and nothing pruned: it scores messages made of
 *  these as the whole table would, as long as no absent token counts. */
export function serveTokens(
  counts: CountsView,
  projection: Projection,
  vocabulary: readonly number[],
  wanted: readonly (Float64Array | null)[],
  fit: Fit,
  halfLifeDays: number | null,
): ServedTable {
  const regions = wanted.map((tokens, g) => {
    let at = 0;
    return projectRegion(counts, projection, g, ({ token }) => {
      if (tokens === null) return true;
      while (at < tokens.length && tokens[at] < token) at++;
      return tokens[at] === token;
    });
  });
  const { referenceEpoch, head } = projection;
  const pruned = regions.map(() => new Float64Array(0));
  return {
    counts: { ...head, regions },
    referenceEpoch,
    halfLifeDays,
    vocabulary,
    pruned,
    fit,
    bursts: noBursts(counts.schema),
  };
}
