import { tokenHex } from '../features/schema.ts';
import type { CellDifference, Column, CountsView } from './counts.ts';
import { isSameColumn, nameOf } from './fold.ts';
import { type Rows, rowsOf } from './rows.ts';

/** Where two tables of one schema differ, cell by cell, in the order of the table; at most `max` cells, so that two
 *  unrelated tables do not fill the memory. Empty when they are equal. */
export function diffCounts(a: CountsView, b: CountsView, max: number): CellDifference[] {
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
    if (found.length >= max) return;
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

/** Calls `note` for every cell in which the two differ, until it answers false. */
function diffRegion(
  a: CountsView,
  b: CountsView,
  g: number,
  note: (token: number, column: Column, left: number, right: number) => boolean,
): void {
  const [left, right] = [rowsOf(a.regions[g]), rowsOf(b.regions[g])];
  const same =
    a.columns.length === b.columns.length && a.columns.every((c, i) => isSameColumn(c, b.columns[i]));
  let [hasLeft, hasRight] = [left.next(), right.next()];
  while (hasLeft || hasRight) {
    const token = Math.min(hasLeft ? left.token : Infinity, hasRight ? right.token : Infinity);
    const [isMine, isOther] = [hasLeft && left.token === token, hasRight && right.token === token];
    if (!(same && isMine && isOther && holdSame(left, right))) {
      const mine = isMine ? cellsOf(left, a.columns) : new Map<string, [Column, number]>();
      const other = isOther ? cellsOf(right, b.columns) : new Map<string, [Column, number]>();
      for (const name of new Set([...mine.keys(), ...other.keys()])) {
        const [column] = (mine.get(name) ?? other.get(name)) as [Column, number];
        if (!note(token, column, mine.get(name)?.[1] ?? 0, other.get(name)?.[1] ?? 0)) return;
      }
    }
    if (isMine) hasLeft = left.next();
    if (isOther) hasRight = right.next();
  }
}

function holdSame(left: Rows, right: Rows): boolean {
  if (left.to - left.from !== right.to - right.from) return false;
  for (let p = left.from, q = right.from; p < left.to; p++, q++)
    if (left.column[p] !== right.column[q] || left.count[p] !== right.count[q]) return false;
  return true;
}

function cellsOf(rows: Rows, columns: readonly Column[]): Map<string, [Column, number]> {
  const cells = new Map<string, [Column, number]>();
  for (let p = rows.from; p < rows.to; p++) {
    const column = columns[rows.column[p]];
    cells.set(nameOf(column), [column, rows.count[p]]);
  }
  return cells;
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
