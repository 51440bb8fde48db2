import type { Schema } from '../features/schema.ts';
import { type BurstGroup, type Bursts, noBursts } from './bursts.ts';
import { ByteReader, ByteWriter, layoutOf, seal, unseal } from './bytes.ts';
import { checkCounts } from './check-counts.ts';
import {
  readColumns,
  readCounts,
  readTokens,
  writeColumns,
  writeCounts,
  writeTokens,
} from './codec-counts.ts';
import type { Fit } from './fit.ts';
import { weightUnit } from './projection.ts';
import type { ServedTable } from './served-table.ts';

/** A table of few queues packs its tokens (see codec-counts), most of which stand in one queue, once, and would take 5 bytes to say
 *  so. With more queues than these there are more cells to share a token's bytes, and a table loads faster without. */
const packedQueuesMax = 4;

/** A served table as bytes: reference epoch, half-life, vocabulary, pruned tokens, fit as JSON, counts, bursts. Canonical. */
export function encodeTable(table: ServedTable): Uint8Array {
  const out = new ByteWriter();
  out.varint(table.referenceEpoch);
  out.float64(table.halfLifeDays ?? 0);
  for (const size of table.vocabulary) out.varint(size);
  for (const tokens of table.pruned) writeTokens(out, tokens);
  out.text(JSON.stringify(table.fit));
  const isPacked = table.counts.columns.length <= packedQueuesMax;
  writeCounts(out, table.counts, scaleOf(table.halfLifeDays), isPacked);
  writeBursts(out, table.bursts);
  return seal('table', table.counts.schema.id, out.written());
}

/** Reads what encodeTable wrote, now or in the first layout, and checks the counts whole. Throws TallypostError as decodeCounts does. */
export function decodeTable(bytes: Uint8Array, schema: Schema, place: string): ServedTable {
  const reader = new ByteReader(unseal('table', bytes, schema.id, place), place);
  const referenceEpoch = reader.varint();
  const halfLife = reader.float64();
  const halfLifeDays = halfLife > 0 ? halfLife : null;
  const vocabulary = schema.regions.map(() => reader.varint());
  const pruned = schema.regions.map(() => readTokens(reader));
  const fit = readFit(reader);
  const packedMax = layoutOf(bytes) === 1 ? -1 : packedQueuesMax;
  const counts = readCounts(reader, schema, scaleOf(halfLifeDays), packedMax);
  const bursts = layoutOf(bytes) === 1 ? noBursts(schema) : readBursts(reader, schema);
  reader.end();
  checkCounts(counts, place);
  checkCounts(bursts.excess, place);
  return { counts, referenceEpoch, halfLifeDays, vocabulary, pruned, fit, bursts };
}

function writeBursts(out: ByteWriter, { groups, excess, members }: Bursts): void {
  out.varint(groups.length);
  writeColumns(
    out,
    groups.map((g) => g.column),
  );
  for (const { regions, counted } of groups) {
    out.varint(counted);
    for (const tokens of regions) writeTokens(out, tokens);
  }
  writeCounts(out, excess, 1);
  out.text(JSON.stringify([...members]));
}

function readBursts(reader: ByteReader, schema: Schema): Bursts {
  const length = reader.length();
  const columns = readColumns(reader);
  if (columns.length !== length) throw reader.broken(`${length} columns`, String(columns.length));
  const groups = columns.map((column): BurstGroup => {
    const counted = reader.varint();
    return { column, counted, regions: schema.regions.map(({ tokensMax }) => readTokens(reader, tokensMax)) };
  });
  const excess = readCounts(reader, schema, 1);
  return { groups, excess, members: new Map(JSON.parse(reader.text()) as [string, number][]) };
}

function scaleOf(halfLifeDays: number | null): number {
  return halfLifeDays === null ? 1 : weightUnit;
}

/** The check sum was right, so these are the bytes that were written: only another version's layout can be wrong here. */
function readFit(reader: ByteReader): Fit {
  const fit = JSON.parse(reader.text()) as Fit;
  if (fit.version !== 1) throw reader.broken('a fit of version 1', `version ${String(fit.version)}`);
  return fit;
}
