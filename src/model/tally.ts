import { bounds } from '../bounds.ts';
import type { Schema } from '../features/schema.ts';
import type { Counts, CountsView, EncodedCounts, Entry } from './counts.ts';
import { deltaOf, exactly } from './fold.ts';
import { type Part, sumCounts } from './sum-counts.ts';

/** Adds entries up in bytes: any number of them in the room of their sum. */
export interface Tally {
  /** Counts of a batch, at best some thousand entries. */
  add(entries: readonly Entry[]): void;
  /** `base` with all entries that were added: what `foldEntries` gives, encoded. `place` names it in errors. */
  sum(base: CountsView | null, place: string): EncodedCounts;
}

/** Sums of each level are of some `fan` sums of the one below: each cell is written once a level. */
const fan = 4;

interface Run {
  readonly part: Part;
  readonly level: number;
}

/** What is put in and what is taken out are added up apart, since neither falls below zero on its own; `sum` takes the one from
 *  the other. */
export function createTally(schema: Schema): Tally {
  const runs: Run[] = [];
  let waiting: Entry[] = [];
  const push = (counts: CountsView, sign: Part['sign'], level: number) => {
    runs.push({ part: { counts, sign }, level });
    const same = runs.filter((r) => r.level === level && r.part.sign === sign);
    if (same.length < fan) return;
    for (const run of same) runs.splice(runs.indexOf(run), 1);
    const parts = same.map((r): Part => ({ counts: r.part.counts, sign: 1 }));
    push(sumCounts(schema, parts, 'batch'), sign, level + 1);
  };
  const count = () => {
    const [put, taken] = [sideOf(schema, waiting, 'plus'), sideOf(schema, waiting, 'minus')];
    waiting = [];
    if (put !== null) push(put, 1, 0);
    if (taken !== null) push(taken, -1, 0);
  };
  return {
    add(entries) {
      for (const entry of entries) {
        waiting.push(entry);
        if (waiting.length >= bounds.foldEntriesMax) count();
      }
    },
    sum(base, place) {
      count();
      const parts = runs.map((r) => r.part);
      return sumCounts(schema, base === null ? parts : [{ counts: base, sign: 1 }, ...parts], place);
    },
  };
}

/** Counts of what the entries put in, or of what they take out; null when that is nothing. */
function sideOf(schema: Schema, entries: readonly Entry[], side: 'plus' | 'minus'): Counts | null {
  const sided = entries
    .filter((entry) => entry[side] !== null)
    .map((entry): Entry => ({ ...entry, minus: null, plus: entry[side] }));
  return sided.length === 0 ? null : deltaOf(schema, sided, exactly);
}
