import { tokenHex } from '../features/schema.ts';
import type { CellDifference, Column, Counts, RegionCounts } from './counts.ts';
import { nameOf } from './fold.ts';

/** Where two tables of one schema differ, cell by cell, in the order of the table; at most `max` cells, so that two
 *  unrelated tables do not fill the memory. Empty when they are equal. */
export function diffCounts(a: Counts, b: Counts, max: number): CellDifference[] {
  const found: CellDifference[] = [];
  const note = (cell: string, left: number, right: number) => {
    if (left !== right && found.length < max) found.push({ cell, left, right });
  };
  const pairs = pairColumns(a.columns, b.columns);
  for (const [column, i, j] of pairs) {
    const name = `queue ${column.queue}, epoch ${column.epoch}`;
    note(`messages, ${name}`, a.messages[i] ?? 0, b.messages[j] ?? 0);
    a.schema.slots.forEach((slot, s) => {
      slot.values.forEach((value, v) => {
        const left = i < 0 ? 0 : a.slots[s][v * a.columns.length + i];
        const right = j < 0 ? 0 : b.slots[s][v * b.columns.length + j];
        note(`slot ${slot.id}, value ${value}, ${name}`, left, right);
      });
    });
    a.schema.regions.forEach(({ id }, g) => {
      note(`region ${id}, total, ${name}`, a.regions[g].total[i] ?? 0, b.regions[g].total[j] ?? 0);
    });
  }
  a.schema.regions.forEach(({ id }, g) => {
    diffRegion(a, b, g, (token, column, left, right) => {
      note(
        `region ${id}, token ${tokenHex(token)}, queue ${column.queue}, epoch ${column.epoch}`,
        left,
        right,
      );
      return found.length < max;
    });
  });
  for (let r = 0; r < a.record.length; r++) note(`record, cell ${r}`, a.record[r], b.record[r]);
  return found;
}

/** Calls `note` for every cell that either holds, until it answers false. */
function diffRegion(
  a: Counts,
  b: Counts,
  g: number,
  note: (token: number, column: Column, left: number, right: number) => boolean,
): void {
  const [left, right] = [a.regions[g], b.regions[g]];
  for (let i = 0, j = 0; i < left.tokens.length || j < right.tokens.length; ) {
    const token = Math.min(left.tokens[i] ?? Infinity, right.tokens[j] ?? Infinity);
    const mine = left.tokens[i] === token ? rowOf(left, i++, a.columns) : new Map<string, [Column, number]>();
    const other =
      right.tokens[j] === token ? rowOf(right, j++, b.columns) : new Map<string, [Column, number]>();
    for (const name of new Set([...mine.keys(), ...other.keys()])) {
      const [column] = (mine.get(name) ?? other.get(name)) as [Column, number];
      if (!note(token, column, mine.get(name)?.[1] ?? 0, other.get(name)?.[1] ?? 0)) return;
    }
  }
}

function rowOf(region: RegionCounts, i: number, columns: readonly Column[]): Map<string, [Column, number]> {
  const row = new Map<string, [Column, number]>();
  for (let p = region.start[i]; p < region.start[i + 1]; p++) {
    const column = columns[region.column[p]];
    row.set(nameOf(column), [column, region.count[p]]);
  }
  return row;
}

/** Columns of either table with their index in each, -1 where there is none. */
function pairColumns(a: readonly Column[], b: readonly Column[]): [Column, number, number][] {
  const pairs = new Map<string, [Column, number, number]>();
  a.forEach((c, i) => {
    pairs.set(nameOf(c), [c, i, -1]);
  });
  b.forEach((c, j) => {
    const pair = pairs.get(nameOf(c));
    if (pair) pair[2] = j;
    else pairs.set(nameOf(c), [c, -1, j]);
  });
  return [...pairs.values()];
}
