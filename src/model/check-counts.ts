import { TallypostError } from '../errors.ts';
import { tokenHex } from '../features/schema.ts';
import type { Counts, RegionCounts } from './counts.ts';
import { nameOf } from './fold.ts';
import { recordBands } from './record.ts';

/** Refuses a table that cannot have come from counting: Σ_v d_jc(v) = c_c for every slot j and column c, cells between 1
 *  and c_c, totals no smaller than the sum of their cells, everything ascending and finite.
 *  Throws TallypostError `identity-broken` or `counts-broken`, naming the cell. O(cells). */
export function checkCounts(counts: Counts, place: string): void {
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

function checkRegion(region: RegionCounts, counts: Counts, broken: Broken): void {
  const { columns, messages } = counts;
  const { tokens, start, column, count, total } = region;
  if (start.length !== tokens.length + 1 || start[0] !== 0 || start[tokens.length] !== count.length) {
    throw broken('rows', `${tokens.length} rows over ${count.length} cells`, start.length);
  }
  if (column.length !== count.length || total.length !== columns.length) {
    throw broken('cells', `as many columns as counts, ${columns.length} totals`, column.length);
  }
  const sums = new Float64Array(columns.length);
  for (let i = 0; i < tokens.length; i++) {
    if (i > 0 && !(tokens[i - 1] < tokens[i]))
      throw broken(`token ${tokenHex(tokens[i])}`, 'ascending tokens', 'disorder');
    if (!(start[i] < start[i + 1])) throw broken(`token ${tokenHex(tokens[i])}`, 'at least one cell', 'none');
    for (let p = start[i]; p < start[i + 1]; p++) {
      const isOrdered = column[p] < columns.length && (p === start[i] || column[p - 1] < column[p]);
      if (!isOrdered)
        throw broken(`token ${tokenHex(tokens[i])}`, `ascending columns below ${columns.length}`, column[p]);
      if (!(count[p] > 0 && count[p] <= messages[column[p]])) {
        const cell = `token ${tokenHex(tokens[i])}, column ${nameOf(columns[column[p]])}`;
        throw broken(cell, `a count from 1 to the column's ${messages[column[p]]} messages`, count[p]);
      }
      sums[column[p]] += count[p];
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

function isBefore(a: Counts['columns'][number], b: Counts['columns'][number]): boolean {
  return a.queue === b.queue ? a.epoch < b.epoch : a.queue < b.queue;
}
