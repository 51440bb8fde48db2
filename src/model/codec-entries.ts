import type { Features, Schema } from '../features/schema.ts';
import { ByteReader, ByteWriter, seal, unseal } from './bytes.ts';
import { readColumns, readTokens, writeColumns, writeTokens } from './codec-counts.ts';
import type { Column, Entry, Said } from './counts.ts';

/** Features as text for a message's history: base64 of sealed bytes, about 5 bytes a token. Canonical. */
export function encodeFeatures(features: Features): string {
  const out = new ByteWriter();
  writeFeatures(out, features);
  return Buffer.from(seal('features', features.schema, out.written())).toString('base64');
}

/** Reads what encodeFeatures wrote. Throws TallypostError as decodeCounts does. */
export function decodeFeatures(text: string, schema: Schema, place: string): Features {
  const reader = new ByteReader(unseal('features', Buffer.from(text, 'base64'), schema.id, place), place);
  const features = readFeatures(reader, schema);
  reader.end();
  return features;
}

/** A segment: entries in their order, each column and queue named once. */
export function encodeEntries(schema: Schema, entries: readonly Entry[]): Uint8Array {
  const columns: Column[] = [];
  const index = new Map<string, number>();
  const indexOf = (column: Column | null): number => {
    if (column === null) return 0;
    const name = `${column.queue}@${column.epoch}`;
    if (!index.has(name)) index.set(name, columns.push(column));
    return index.get(name) as number;
  };
  const sides = entries.map((e) => [indexOf(e.minus), indexOf(e.plus)]);
  const out = new ByteWriter();
  writeColumns(out, columns);
  out.varint(entries.length);
  entries.forEach((entry, i) => {
    out.varint(sides[i][0]);
    out.varint(sides[i][1]);
    writeSaid(out, entry.said);
    writeFeatures(out, entry.features);
  });
  return seal('entries', schema.id, out.written());
}

/** Reads what encodeEntries wrote. Throws TallypostError as decodeCounts does. */
export function decodeEntries(bytes: Uint8Array, schema: Schema, place: string): Entry[] {
  const reader = new ByteReader(unseal('entries', bytes, schema.id, place), place);
  const columns = readColumns(reader);
  const side = (): Column | null => {
    const index = reader.length(columns.length);
    return index === 0 ? null : columns[index - 1];
  };
  const entries: Entry[] = [];
  for (let left = reader.length(); left > 0; left--) {
    const minus = side();
    const plus = side();
    const said = readSaid(reader);
    entries.push({ features: readFeatures(reader, schema), said, minus, plus });
  }
  reader.end();
  return entries;
}

function writeSaid(out: ByteWriter, said: Said | null): void {
  out.byte(said === null ? 0 : said.isAudit ? 2 : 1);
  if (said === null) return;
  out.text(said.queue);
  out.float64(said.posterior);
}

function readSaid(reader: ByteReader): Said | null {
  const kind = reader.byte();
  if (kind > 2) throw reader.broken('0, 1 or 2', String(kind));
  if (kind === 0) return null;
  const queue = reader.text();
  const posterior = reader.float64();
  if (!(posterior >= 0 && posterior <= 1)) throw reader.broken('a posterior from 0 to 1', String(posterior));
  return { queue, posterior, isAudit: kind === 2 };
}

function writeFeatures(out: ByteWriter, features: Features): void {
  for (const value of features.slots) out.varint(value);
  for (const tokens of features.regions) writeTokens(out, tokens);
}

function readFeatures(reader: ByteReader, schema: Schema): Features {
  return {
    schema: schema.id,
    slots: schema.slots.map((slot) => reader.length(slot.values.length - 1)),
    regions: schema.regions.map((region) => readTokens(reader, region.tokensMax)),
  };
}
