import { TallypostError } from '../errors.ts';
import { type Schema, tokenHex } from '../features/schema.ts';
import { ByteWriter, createSealedWriter, sealWritten } from './bytes.ts';
import { writeColumns, writeRow } from './codec-counts.ts';
import type { Column, CountsView, EncodedCounts, EncodedRegion, RegionCounts } from './counts.ts';
import { indexOf, nameOf, schemaMismatch, unionOf } from './fold.ts';
import { recordBands } from './record.ts';
import { type Rows, rowsOf } from './rows.ts';
import { negative } from './sparse.ts';

/** Counts to be added, or to be taken out. */
export interface Part {
  readonly counts: CountsView;
  readonly sign: 1 | -1;
}

/** The sum of all parts as `encodeCounts` would write it, made token by token: besides the parts it takes the room of its own bytes
 *  and once more that of its largest region. Exact, so that no order and no division into parts changes a byte. O(cells · parts).
 *  `place` names the result in later errors. Throws TallypostError `counts-negative` when more is taken out than is there,
 *  `counts-broken` when a column is left without messages and not empty, `schema-mismatch`. */
export function sumCounts(schema: Schema, parts: readonly Part[], place: string): EncodedCounts {
  for (const { counts } of parts)
    if (counts.schema.id !== schema.id) throw schemaMismatch('table', schema.id, counts.schema.id);
  const head = sumHeads(schema, parts);
  const out = createSealedWriter(parts.reduce((bytes, { counts }) => bytes + sizeOf(counts), 4096));
  const base = out.length;
  writeColumns(out, head.columns);
  for (const n of head.messages) out.varint(n);
  for (const d of head.slots) for (const n of d) out.varint(n);
  const room = { tokens: new ByteWriter(), cells: new ByteWriter() };
  const regions = schema.regions.map(({ id }, g) => sumRegion(out, base, parts, g, id, head, room, place));
  for (const n of head.record) out.varint(n);
  const { columns, messages, slots, record } = head;
  const bytes = sealWritten('counts', schema.id, out);
  const payload = bytes.subarray(base, -4);
  return {
    schema,
    columns,
    messages,
    slots,
    regions: regions.map((region) => ({ ...region, bytes: payload })),
    record,
    bytes,
  };
}

interface SummedHead {
  readonly columns: readonly Column[];
  readonly messages: Float64Array;
  readonly slots: readonly Float64Array[];
  readonly record: Float64Array;
  /** Columns of all parts, those without messages left included. */
  readonly all: readonly Column[];
  /** Of `all` to `columns`, -1 where no message is left. */
  readonly kept: Int32Array;
  /** Of each part's columns to `all`. */
  readonly to: readonly Int32Array[];
}

function sumHeads(schema: Schema, parts: readonly Part[]): SummedHead {
  const all = unionOf(
    parts.flatMap(({ counts }) => [...counts.columns]),
    [],
  );
  const index = indexOf(all);
  const to = parts.map(({ counts }) =>
    Int32Array.from(counts.columns, (column) => index.get(nameOf(column)) as number),
  );
  const summed = addUp(parts, to, all.length, ({ messages }) => messages, 'messages');
  const left = [...all.keys()].filter((c) => summed[c] > 0);
  const kept = new Int32Array(all.length).fill(-1);
  left.forEach((c, at) => {
    kept[c] = at;
  });
  const slots = schema.slots.map(({ id, values }, j) => {
    const out = new Float64Array(values.length * left.length);
    for (let v = 0; v < values.length; v++) {
      const row = addUp(
        parts,
        to,
        all.length,
        ({ slots: d, columns }) => d[j].subarray(v * columns.length, (v + 1) * columns.length),
        `slot ${id}`,
      );
      left.forEach((c, at) => {
        out[v * left.length + at] = row[c];
      });
    }
    return out;
  });
  const same = Int32Array.from({ length: recordBands * 4 }, (_, i) => i);
  const record = addUp(
    parts,
    parts.map(() => same),
    recordBands * 4,
    (counts) => counts.record,
    'record',
  );
  const columns = left.map((c) => all[c]);
  return { columns, messages: Float64Array.from(left, (c) => summed[c]), slots, record, all, kept, to };
}

/** Sum of the parts' values, part p's column c at `to[p][c]`; refused below zero. */
function addUp(
  parts: readonly Part[],
  to: readonly Int32Array[],
  length: number,
  valuesOf: (counts: CountsView) => Float64Array,
  place: string,
): Float64Array {
  const sum = new Float64Array(length);
  parts.forEach(({ counts, sign }, p) => {
    valuesOf(counts).forEach((value, c) => {
      sum[to[p][c]] += sign * value;
    });
  });
  for (const value of sum) if (value < 0) throw negative(place, value);
  return sum;
}

/** Writes the sum of one region behind what `out` holds; places in the result are relative to `base`. */
function sumRegion(
  out: ByteWriter,
  base: number,
  parts: readonly Part[],
  g: number,
  id: string,
  head: SummedHead,
  room: { readonly tokens: ByteWriter; readonly cells: ByteWriter },
  place: string,
): EncodedRegion {
  const { all, kept, to } = head;
  const { tokens, cells } = room;
  tokens.clear();
  cells.clear();
  const sources = parts.map(({ counts }) => rowsOf(counts.regions[g]));
  const next = Float64Array.from(sources, (rows) => (rows.next() ? rows.token : Infinity));
  // The cells of one token: the sum so far, and where the next sum goes.
  let [sum, more] = [emptyRow(all.length), emptyRow(all.length)];
  let [previous, rows, cellsHeld] = [-1, 0, 0];
  for (;;) {
    let token = Infinity;
    for (let p = 0; p < next.length; p++) if (next[p] < token) token = next[p];
    if (token === Infinity) break;
    sum.length = 0;
    for (let p = 0; p < next.length; p++) {
      if (next[p] !== token) continue;
      addRow(more, sum, sources[p], to[p], parts[p].sign);
      [sum, more] = [more, sum];
      next[p] = sources[p].next() ? sources[p].token : Infinity;
    }
    let held = 0;
    for (let i = 0; i < sum.length; i++) {
      const count = sum.count[i];
      if (count === 0) continue;
      if (count < 0) throw negative(`region ${id}, token ${tokenHex(token)}`, count);
      const column = kept[sum.column[i]];
      if (column < 0) throw notEmpty(all[sum.column[i]]);
      sum.column[held] = column;
      sum.count[held++] = count;
    }
    if (held === 0) continue;
    tokens.varint(token - previous - 1);
    previous = token;
    writeRow(cells, sum, 0, held, 1);
    rows++;
    cellsHeld += held;
  }
  const total = addUp(parts, to, all.length, (counts) => counts.regions[g].total, `region ${id}, total`);
  total.forEach((value, c) => {
    if (value > 0 && kept[c] < 0) throw notEmpty(all[c]);
  });
  const totals = total.filter((_, c) => kept[c] >= 0);
  for (const value of totals) out.varint(value);
  out.varint(rows);
  const tokensAt = out.length - base;
  out.raw(tokens.written());
  out.varint(cellsHeld);
  const cellsAt = out.length - base;
  out.raw(cells.written());
  const [endAt, columns] = [out.length - base, head.columns.length];
  const bytes = new Uint8Array(0);
  return { total: totals, rows, cells: cellsHeld, columns, bytes, tokensAt, cellsAt, endAt, place };
}

/** Cells of one token, ascending by column. */
interface Row {
  readonly column: Int32Array;
  readonly count: Float64Array;
  length: number;
}

function emptyRow(columns: number): Row {
  return { column: new Int32Array(columns), count: new Float64Array(columns), length: 0 };
}

/** Makes `out` the sum of `row` and `sign` times the present token of `rows`, whose column c is `to[c]`. */
function addRow(
  out: Row,
  row: Row,
  { column, count, from, to: end }: Rows,
  to: Int32Array,
  sign: 1 | -1,
): void {
  let [at, length] = [0, 0];
  for (let i = from; i < end; i++) {
    const c = to[column[i]];
    for (; at < row.length && row.column[at] < c; length++) {
      out.column[length] = row.column[at];
      out.count[length] = row.count[at++];
    }
    const before = at < row.length && row.column[at] === c ? row.count[at++] : 0;
    out.column[length] = c;
    out.count[length++] = before + sign * count[i];
  }
  for (; at < row.length; length++) {
    out.column[length] = row.column[at];
    out.count[length] = row.count[at++];
  }
  out.length = length;
}

/** A column whose last message was taken out must be empty altogether; otherwise something was taken out of the wrong one. */
function notEmpty(column: Column): TallypostError {
  return new TallypostError({
    code: 'counts-broken',
    place: `column ${nameOf(column)}`,
    expected: 'no counts, since no message is left',
    got: 'some',
  });
}

/** About what the counts take when they are encoded. */
function sizeOf(counts: CountsView): number {
  const bytesOf = (r: RegionCounts | EncodedRegion) =>
    'bytes' in r ? r.endAt - r.tokensAt : r.tokens.length * 5 + r.column.length * 2;
  const values = counts.schema.slots.reduce((sum, slot) => sum + slot.values.length, 0);
  const head = counts.columns.length * (20 + 2 * (values + counts.regions.length));
  return head + counts.regions.reduce((sum, r) => sum + bytesOf(r), 0);
}
