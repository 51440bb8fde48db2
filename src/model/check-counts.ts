import { TallypostError } from '../errors.ts';
import { tokenHex } from '../features/schema.ts';
import type { Counts, CountsView, EncodedRegion, RegionCounts } from './counts.ts';
import { nameOf } from './fold.ts';
import { recordBands } from './record.ts';
import { rowsOf } from './rows.ts';

/** Refuses a table that cannot have come from counting: Σ_v d_jc(v) = c_c for every slot j and column c, cells between 1
 *  and c_c, totals no smaller than the sum of their cells, everything ascending and finite.
 *  Throws TallypostError `identity-broken` or `counts-broken`, naming the cell. O(cells). */
export function checkCounts(counts: CountsView, place: string): void {
  const { schema, columns, messages } = counts;
  const broken = (cell: string, expected: string, got: string | number, code = 'counts-broken') =>
    new TallypostError({ code, place: `${place}, ${cell}`, expected, got: String(got) });

  if (messages.length !== columns.length)
    throw broken('messages', `${columns.length} columns`, messages.length);
  for (let c = 0; c < columns.length; c++) {
    if (c > 0 && !isBefore(columns[c - 1], columns[c])) {
      throw broken(
        `column ${nameOf(columns[c])}`,
        'columns ascending by queue and epoch',
        nameOf(columns[c - 1]),
      );
    }
    if (!(messages[c] > 0 && Number.isFinite(messages[c]))) {
      throw broken(`column ${nameOf(columns[c])}`, 'at least one message', messages[c]);
    }
  }
  if (counts.slots.length !== schema.slots.length)
    throw broken('slots', String(schema.slots.length), counts.slots.length);
  counts.slots.forEach((d, j) => {
    const { id, values } = schema.slots[j];
    if (d.length !== values.length * columns.length) {
      throw broken(`slot ${id}`, `${values.length} values of ${columns.length} columns`, d.length);
    }
    for (let c = 0; c < columns.length; c++) {
      let sum = 0;
      for (let v = 0; v < values.length; v++) {
        const count = d[v * columns.length + c];
        if (!(count >= 0))
          throw broken(`slot ${id}, value ${v}, column ${nameOf(columns[c])}`, 'a count', count);
        sum += count;
      }
      if (sum !== messages[c]) {
        throw broken(
          `slot ${id}, column ${nameOf(columns[c])}`,
          `counts that sum to ${messages[c]}`,
          sum,
          'identity-broken',
        );
      }
    }
  });
  if (counts.regions.length !== schema.regions.length) {
    throw broken('regions', String(schema.regions.length), counts.regions.length);
  }
  counts.regions.forEach((region, g) => {
    checkRegion(region, counts, (cell, expected, got, code) =>
      broken(`region ${schema.regions[g].id}, ${cell}`, expected, got, code),
    );
  });
  if (counts.record.length !== recordBands * 4)
    throw broken('record', `${recordBands * 4} cells`, counts.record.length);
  counts.record.forEach((n, i) => {
    if (!(n >= 0)) throw broken(`record, cell ${i}`, 'a count', n);
  });
}

type Broken = (cell: string, expected: string, got: string | number, code?: string) => TallypostError;

function checkRegion(region: RegionCounts | EncodedRegion, counts: CountsView, broken: Broken): void {
  const { columns, messages } = counts;
  const { total } = region;
  if (total.length !== columns.length)
    throw broken('totals', `as many as columns, ${columns.length}`, total.length);
  if (!('bytes' in region)) checkRows(region, broken);
  const sums = new Float64Array(columns.length);
  const rows = rowsOf(region);
  const { column, count } = rows;
  for (let previous = -1; rows.next(); previous = rows.token) {
    const { token, from, to } = rows;
    if (!(previous < token)) throw broken(`token ${tokenHex(token)}`, 'ascending tokens', 'disorder');
    for (let p = from; p < to; p++) {
      const c = column[p];
      const isOrdered = c < columns.length && (p === from || column[p - 1] < c);
      if (!isOrdered)
        throw broken(`token ${tokenHex(token)}`, `ascending columns below ${columns.length}`, c);
      if (!(count[p] > 0 && count[p] <= messages[c])) {
        const cell = `token ${tokenHex(token)}, column ${nameOf(columns[c])}`;
        throw broken(cell, `a count from 1 to the column's ${messages[c]} messages`, count[p]);
      }
      sums[c] += count[p];
    }
  }
  for (let c = 0; c < columns.length; c++) {
    // A table that was pruned keeps the share of its dropped tokens in the total.
    if (!(total[c] >= sums[c])) {
      throw broken(
        `total of column ${nameOf(columns[c])}`,
        `at least the ${sums[c]} of its cells`,
        total[c],
        'identity-broken',
      );
    }
  }
}

/** Rows in memory: each is the stretch of cells between two starts, and none is empty. */
function checkRows({ tokens, start, column, count }: RegionCounts, broken: Broken): void {
  if (start.length !== tokens.length + 1 || start[0] !== 0 || start[tokens.length] !== count.length)
    throw broken('rows', `${tokens.length} rows over ${count.length} cells`, start.length);
  if (column.length !== count.length) throw broken('cells', `as many columns as counts`, column.length);
  for (let i = 0; i < tokens.length; i++)
    if (!(start[i] < start[i + 1])) throw broken(`token ${tokenHex(tokens[i])}`, 'at least one cell', 'none');
}

function isBefore(a: Counts['columns'][number], b: Counts['columns'][number]): boolean {
  return a.queue === b.queue ? a.epoch < b.epoch : a.queue < b.queue;
}
