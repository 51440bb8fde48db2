import type { Features, Schema } from '../../src/features/schema.ts';
import type { Entry } from '../../src/model/counts.ts';
import { defaultFit, type Fit } from '../../src/model/fit.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { createScorer, type Scorer } from '../../src/model/scorer.ts';
import { serve } from '../../src/model/served-table.ts';

/** A table of slots alone, as textbooks have it: column names with their values, rows of values with their class last. */
export function learnRows(
  columns: Readonly<Record<string, readonly string[]>>,
  rows: readonly (readonly string[])[],
  priors: { readonly alpha: number; readonly beta: number },
): { readonly scorer: Scorer; readonly featuresOf: (row: readonly string[]) => Features } {
  const slots = Object.entries(columns).map(([id, values]) => ({ id, group: 'all', values }));
  const schema: Schema = { id: 'aaaaaaaaaaaaaaaa', version: 1, slots, regions: [] };
  const featuresOf = (row: readonly string[]): Features => ({
    schema: schema.id,
    slots: slots.map((slot, j) => slot.values.indexOf(row[j])),
    regions: [],
  });
  const entries = rows.map(
    (row): Entry => ({
      features: featuresOf(row),
      said: null,
      minus: null,
      plus: { queue: row[slots.length], epoch: 0 },
    }),
  );
  const fit: Fit = {
    ...defaultFit(schema),
    blocks: [
      { kind: 'prior', exponent: 1, byQueue: {} },
      { kind: 'slots', group: 'all', exponent: 1, byQueue: {} },
    ],
    alpha: priors.alpha,
    beta: Object.fromEntries(slots.map((slot) => [slot.id, priors.beta])),
  };
  const table = serve(foldEntries(emptyCounts(schema), entries), fit, { halfLifeDays: null });
  const queues = table.counts.columns.map((column) => column.queue);
  return { scorer: createScorer(table, [], queues, null), featuresOf };
}
