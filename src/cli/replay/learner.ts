import { bounds } from '../../bounds.ts';
import type { Desk } from '../../desk/desk.ts';
import type { Features, Schema } from '../../features/schema.ts';
import { encodeTable } from '../../model/codec-table.ts';
import type { Entry, Said } from '../../model/counts.ts';
import { defaultFit } from '../../model/fit.ts';
import { type FoldedMessage, fitTable } from '../../model/fit-table.ts';
import { emptyCounts, epochAt, foldEntries } from '../../model/fold.ts';
import { createScorer, type Scorer } from '../../model/scorer.ts';
import { emptyTable, type ServedTable, serve } from '../../model/served-table.ts';

/** A table that learns in memory by the steps of the confirming and compacting functions, without a store. */
export interface Learner {
  /** One confirmed message, with what was said of it before; in force for the scorer from the next `refresh` or `compact` on. */
  fold(features: Features, queue: string, atMs: number, said: Said | null): void;
  /** What a router would have loaded by now: the last compaction's table with everything folded since. */
  refresh(): Scorer;
  /** What a nightly compaction does: fit the exponents, prune, make the served table. */
  compact(): void;
  /** Messages folded. */
  readonly messages: number;
  /** Folded since the last refresh or compaction. */
  readonly waiting: number;
  table(): ServedTable;
  tableBytes(): number;
}

export function createLearner(desk: Desk, schema: Schema, isFitting: boolean): Learner {
  const queues = desk.queues.map((queue) => queue.id);
  const { halfLifeDays } = desk;
  const sample: FoldedMessage[] = [];
  let counts = emptyCounts(schema);
  let fit = defaultFit(schema);
  let table = emptyTable(schema);
  /** Folded since the last compaction: what segments would hold. */
  let overlay: Entry[] = [];
  let uncounted = 0;
  let waiting = 0;

  const count = () => {
    if (uncounted > 0) counts = foldEntries(counts, overlay.slice(-uncounted));
    uncounted = 0;
  };
  return {
    fold(features, queue, atMs, said) {
      const epoch = epochAt(atMs);
      overlay.push({ features, said, minus: null, plus: { queue, epoch } });
      sample.push({ features, queue, epoch });
      uncounted += 1;
      waiting += 1;
      // As many at once as fold best: the sum is the same for every batching.
      if (uncounted >= bounds.foldEntriesMax) count();
    },
    refresh() {
      waiting = 0;
      return createScorer(table, overlay, queues, halfLifeDays);
    },
    compact() {
      count();
      if (isFitting) fit = fitTable(counts, sample, fit, { halfLifeDays });
      table = serve(counts, fit, { halfLifeDays });
      overlay = [];
      waiting = 0;
    },
    get messages() {
      return sample.length;
    },
    get waiting() {
      return waiting;
    },
    table: () => table,
    tableBytes: () => encodeTable(table).length,
  };
}
