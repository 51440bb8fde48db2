import type { Schema } from '../features/schema.ts';
import { ByteReader, unseal } from './bytes.ts';
import { checkCounts } from './check-counts.ts';
import { readColumns } from './codec-counts.ts';
import type { EncodedCounts, EncodedRegion } from './counts.ts';
import { recordBands } from './record.ts';

/** Counts that stay in the bytes that `encodeCounts` wrote, checked whole. `place` names the object in errors.
 *  Throws TallypostError as `decodeCounts` does. */
export function openCounts(bytes: Uint8Array, schema: Schema, place: string): EncodedCounts {
  const payload = unseal('counts', bytes, schema.id, place);
  const reader = new ByteReader(payload, place);
  const columns = readColumns(reader);
  const read = (length: number) => Float64Array.from({ length }, () => reader.varint());
  const messages = read(columns.length);
  const slots = schema.slots.map((slot) => read(slot.values.length * columns.length));
  const regions = schema.regions.map((): EncodedRegion => {
    const total = read(columns.length);
    const rows = reader.length();
    const tokensAt = reader.at;
    reader.moveTo(behind(payload, tokensAt, rows));
    const cells = reader.length();
    const cellsAt = reader.at;
    const endAt = behindCells(reader, cells);
    return { total, rows, cells, columns: columns.length, bytes: payload, tokensAt, cellsAt, endAt, place };
  });
  const record = read(recordBands * 4);
  reader.end();
  const counts = { schema, columns, messages, slots, regions, record, bytes };
  checkCounts(counts, place);
  return counts;
}

/** Where `numbers` varints from `at` on end, or the end of the bytes. */
function behind(bytes: Uint8Array, at: number, numbers: number): number {
  let left = numbers;
  let end = at;
  while (left > 0 && end < bytes.length) if (bytes[end++] < 0x80) left--;
  return end;
}

function behindCells(reader: ByteReader, cells: number): number {
  for (let left = cells; left > 0; left--) if (reader.varint() & 1) reader.varint();
  return reader.at;
}
