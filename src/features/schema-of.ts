import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import type { RegionSchema, Schema, SlotSchema } from './schema.ts';
import { createSipHash } from './siphash.ts';
import { slotsOf } from './slots.ts';

/** Raised whenever the same message would give other features under the same desk's file: old tables are refused then. */
export const schemaVersion = 2;

/** Where tokens are drawn from, in the order of every array of regions: words from all that there is to read, quoted and
 *  forwarded text too; pairs and grams from what the writer wrote. */
export const regionSchemas: readonly RegionSchema[] = [
  { id: 'subject', tokensMax: bounds.subjectTokensMax },
  { id: 'word', tokensMax: bounds.wordTokensMax },
  { id: 'pair', tokensMax: bounds.pairTokensMax },
  { id: 'gram', tokensMax: bounds.gramTokensMax },
];

/** What a table of this desk counts. Queues are no part of it: opening one leaves every table valid.
 *  Throws TallypostError `token-key-length`. */
export function schemaOf(desk: Desk, tokenKey: Uint8Array): Schema {
  return schemaFrom(
    slotsOf(desk).map((each) => each.schema),
    tokenKey,
  );
}

/** The id is a keyed fingerprint, so that tables hashed under another key are refused and the key stays unknown. */
export function schemaFrom(slots: readonly SlotSchema[], tokenKey: Uint8Array): Schema {
  const body = { version: schemaVersion, slots, regions: regionSchemas };
  return { id: createSipHash(tokenKey).fingerprint(JSON.stringify(body)), ...body };
}
