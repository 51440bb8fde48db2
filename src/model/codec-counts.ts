import { type Schema, tokenBits } from '../features/schema.ts';
import { BitReader, BitWriter } from './bits.ts';
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
 *  nothing ages, else the weight unit of a projection.
 *
 *  Packed, tokens are bits: the difference, whether the token has one cell of 1, and if so its column; the cells of all
 *  others follow as above. Differences are Rice codes (Rice and Plaunt, IEEE Trans. Communications 19, 1971): as many low
 *  bits as the mean difference of evenly spread hashes has, less one; the rest in unary. */
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

export function writeCounts(out: ByteWriter, counts: Counts, scale: number, isPacked = false): void {
  writeColumns(out, counts.columns);
  for (const n of counts.messages) out.varint(n * scale);
  for (const d of counts.slots) for (const n of d) out.varint(n * scale);
  for (const region of counts.regions) writeRegion(out, region, scale, isPacked);
  for (const n of counts.record) out.varint(n);
}

/** Tables of at most `packedMax` columns are packed. */
export function readCounts(reader: ByteReader, schema: Schema, scale: number, packedMax = -1): Counts {
  const columns = readColumns(reader);
  const read = (length: number, unit = scale) => Float64Array.from({ length }, () => reader.varint() / unit);
  const messages = read(columns.length);
  const slots = schema.slots.map((slot) => read(slot.values.length * columns.length));
  const regions = schema.regions.map(() =>
    readRegion(reader, columns.length, scale, columns.length <= packedMax),
  );
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

function writeRegion(out: ByteWriter, region: RegionCounts, scale: number, isPacked: boolean): void {
  const columns = region.total.length;
  const isSingle = (i: number) =>
    isPacked && region.start[i + 1] - region.start[i] === 1 && region.count[region.start[i]] * scale === 1;
  for (const total of region.total) out.varint(total * scale);
  if (!isPacked) writeTokens(out, region.tokens);
  else {
    const { length } = region.tokens;
    const [low, width] = [lowBits(length), columnBits(columns)];
    out.varint(length);
    const bits = new BitWriter(out);
    let previous = -1;
    region.tokens.forEach((token, i) => {
      const difference = token - previous - 1;
      for (let unary = Math.floor(difference / 2 ** low); unary > 0; unary--) bits.write(1, 1);
      bits.write(0, 1);
      bits.write(difference % 2 ** low, low);
      bits.write(isSingle(i) ? 1 : 0, 1);
      if (isSingle(i)) bits.write(region.column[region.start[i]], width);
      previous = token;
    });
    bits.end();
  }
  out.varint(region.count.length);
  for (let i = 0; i < region.tokens.length; i++) {
    if (!isSingle(i)) writeRow(out, region, region.start[i], region.start[i + 1], scale);
  }
}

/** The cells of one token, which stand at `from` to `end`, ascending by column. */
export function writeRow(
  out: ByteWriter,
  { column, count: counts }: { readonly column: ArrayLike<number>; readonly count: ArrayLike<number> },
  from: number,
  end: number,
  scale: number,
): void {
  let next = 0;
  for (let p = from; p < end; p++) {
    const count = counts[p] * scale;
    out.varint((column[p] - next) * 4 + (p + 1 === end ? 2 : 0) + (count === 1 ? 0 : 1));
    if (count !== 1) out.varint(count - 2);
    next = column[p] + 1;
  }
}

function readRegion(reader: ByteReader, columns: number, scale: number, isPacked: boolean): RegionCounts {
  const total = Float64Array.from({ length: columns }, () => reader.varint() / scale);
  const { tokens, single } = isPacked
    ? readPackedTokens(reader, columns)
    : { tokens: readTokens(reader), single: null };
  const cells = isPacked ? reader.length(tokens.length * columns) : reader.length();
  const start = new Uint32Array(tokens.length + 1);
  const column = new Uint32Array(cells);
  const count = new Float64Array(cells);
  let p = 0;
  for (let i = 0; i < tokens.length; i++) {
    if (single !== null && single[i] < columns) {
      if (p === cells) throw reader.broken(`${cells} cells`, 'more');
      column[p] = single[i];
      count[p++] = 1 / scale;
    } else {
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
    }
    start[i + 1] = p;
  }
  if (p !== cells) throw reader.broken(`${cells} cells`, String(p));
  return { tokens, start, column, count, total };
}

/** Tokens, and of each the column of its only cell, or the number of columns when its cells stand apart. */
function readPackedTokens(
  reader: ByteReader,
  columns: number,
): { readonly tokens: Float64Array; readonly single: Uint32Array } {
  const tokens = new Float64Array(reader.length());
  const single = new Uint32Array(tokens.length);
  const [low, width] = [lowBits(tokens.length), columnBits(columns)];
  const bits = new BitReader(reader);
  let previous = -1;
  for (let i = 0; i < tokens.length; i++) {
    let difference = 0;
    while (bits.read(1) === 1) difference += 2 ** low;
    difference += bits.read(low);
    single[i] = bits.read(1) === 1 ? bits.read(width) : columns;
    if (single[i] > columns) throw reader.broken(`a column below ${columns}`, String(single[i]));
    previous += difference + 1;
    tokens[i] = previous;
  }
  if (previous >= 2 ** tokenBits) throw reader.broken(`tokens below 2^${tokenBits}`, String(previous));
  return { tokens, single };
}

/** Low bits of the differences of so many tokens: the mean is 2^tokenBits / tokens. */
function lowBits(tokens: number): number {
  return tokenBits - 1 - Math.floor(Math.log2(Math.max(1, tokens)));
}

function columnBits(columns: number): number {
  return Math.ceil(Math.log2(Math.max(1, columns)));
}
