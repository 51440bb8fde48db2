import { type Schema, tokenBits } from '../features/schema.ts';
import { ByteReader, ByteWriter, seal, unseal } from './bytes.ts';
import { checkCounts } from './check-counts.ts';
import type { Column, Counts, RegionCounts } from './counts.ts';
import { recordBands } from './record.ts';

/** The counts as bytes: canonical (equal counts give equal bytes), checksummed, about 5 bytes a token and 1 to 2 a cell.
 *
 *  Payload: columns (queue names once, then index and epoch), messages; per slot, value-major counts; per region, totals,
 *  tokens as differences of the ascending hashes, then per cell
 *
 *      varint( columns skipped * 4 + (last cell of its token ? 2 : 0) + (count is 1 ? 0 : 1) ) [varint(count - 2)]
 *
 *  so that the most frequent cell, a token seen once, takes a byte. All counts are whole numbers of 1/scale: 1 where
 *  nothing ages, else the weight unit of a projection. */
export function encodeCounts(counts: Counts): Uint8Array {
  const out = new ByteWriter();
  writeCounts(out, counts, 1);
  return seal('counts', counts.schema.id, out.written());
}

/** Reads what encodeCounts wrote and checks it whole (see checkCounts). `place` names the object in errors.
 *  Throws TallypostError `bytes-truncated`, `bytes-altered`, `bytes-broken`, `format-unknown`, `schema-mismatch`,
 *  `identity-broken`, `counts-broken`. */
export function decodeCounts(bytes: Uint8Array, schema: Schema, place: string): Counts {
  const reader = new ByteReader(unseal('counts', bytes, schema.id, place), place);
  const counts = readCounts(reader, schema, 1);
  reader.end();
  checkCounts(counts, place);
  return counts;
}

export function writeCounts(out: ByteWriter, counts: Counts, scale: number): void {
  writeColumns(out, counts.columns);
  for (const n of counts.messages) out.varint(n * scale);
  for (const d of counts.slots) for (const n of d) out.varint(n * scale);
  for (const region of counts.regions) writeRegion(out, region, scale);
  for (const n of counts.record) out.varint(n);
}

export function readCounts(reader: ByteReader, schema: Schema, scale: number): Counts {
  const columns = readColumns(reader);
  const read = (length: number, unit = scale) => Float64Array.from({ length }, () => reader.varint() / unit);
  const messages = read(columns.length);
  const slots = schema.slots.map((slot) => read(slot.values.length * columns.length));
  const regions = schema.regions.map(() => readRegion(reader, columns.length, scale));
  const record = read(recordBands * 4, 1);
  return { schema, columns, messages, slots, regions, record };
}

/** Queue names once, in the order of their first column; then name index and epoch a column. */
export function writeColumns(out: ByteWriter, columns: readonly Column[]): void {
  const names = [...new Set(columns.map((c) => c.queue))];
  out.varint(names.length);
  for (const name of names) out.text(name);
  out.varint(columns.length);
  for (const { queue, epoch } of columns) {
    out.varint(names.indexOf(queue));
    out.varint(epoch);
  }
}

export function readColumns(reader: ByteReader): Column[] {
  const names = Array.from({ length: reader.length() }, () => reader.text());
  return Array.from({ length: reader.length() }, () => {
    const name = reader.varint();
    if (name >= names.length) throw reader.broken(`a queue below ${names.length}`, String(name));
    return { queue: names[name], epoch: reader.varint() };
  });
}

/** Ascending tokens as differences; the first against -1, so that none is zero. */
export function writeTokens(out: ByteWriter, tokens: Float64Array): void {
  out.varint(tokens.length);
  let previous = -1;
  for (const token of tokens) {
    out.varint(token - previous - 1);
    previous = token;
  }
}

export function readTokens(reader: ByteReader, max?: number): Float64Array {
  const tokens = new Float64Array(reader.length(max));
  let previous = -1;
  for (let i = 0; i < tokens.length; i++) {
    previous += reader.varint() + 1;
    tokens[i] = previous;
  }
  if (previous >= 2 ** tokenBits) throw reader.broken(`tokens below 2^${tokenBits}`, String(previous));
  return tokens;
}

function writeRegion(out: ByteWriter, region: RegionCounts, scale: number): void {
  for (const total of region.total) out.varint(total * scale);
  writeTokens(out, region.tokens);
  out.varint(region.count.length);
  for (let i = 0; i < region.tokens.length; i++) {
    let next = 0;
    for (let p = region.start[i]; p < region.start[i + 1]; p++) {
      const isLast = p + 1 === region.start[i + 1];
      const count = region.count[p] * scale;
      out.varint((region.column[p] - next) * 4 + (isLast ? 2 : 0) + (count === 1 ? 0 : 1));
      if (count !== 1) out.varint(count - 2);
      next = region.column[p] + 1;
    }
  }
}

function readRegion(reader: ByteReader, columns: number, scale: number): RegionCounts {
  const total = Float64Array.from({ length: columns }, () => reader.varint() / scale);
  const tokens = readTokens(reader);
  const cells = reader.length();
  const start = new Uint32Array(tokens.length + 1);
  const column = new Uint32Array(cells);
  const count = new Float64Array(cells);
  let p = 0;
  for (let i = 0; i < tokens.length; i++) {
    let next = 0;
    for (let isLast = false; !isLast; p++) {
      if (p === cells) throw reader.broken(`${cells} cells`, 'more');
      const code = reader.varint();
      next += Math.floor(code / 4);
      if (next >= columns) throw reader.broken(`a column below ${columns}`, String(next));
      column[p] = next++;
      isLast = (code & 2) !== 0;
      count[p] = (code & 1 ? reader.varint() + 2 : 1) / scale;
    }
    start[i + 1] = p;
  }
  if (p !== cells) throw reader.broken(`${cells} cells`, String(p));
  return { tokens, start, column, count, total };
}
