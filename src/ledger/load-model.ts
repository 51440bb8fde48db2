import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import type { Fault } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { createBurstGuard } from '../model/bursts.ts';
import type { Entry } from '../model/counts.ts';
import { createScorer, type Scorer } from '../model/scorer.ts';
import { emptyTable, type ServedTable } from '../model/served-table.ts';
import { keys } from '../store/keys.ts';
import { decodeManifest, emptyManifest, type Manifest } from './manifest.ts';
import { readSegment, readTable, withFresh } from './objects.ts';
import { mapBounded } from './pace.ts';
import { currentDesk, currentName } from './queue-names.ts';
import type { World } from './world.ts';

/** One committed state of the model, whole. */
export interface LoadedModel {
  /** Of the manifest; 0 when nothing was ever committed. */
  readonly version: number;
  readonly scorer: Scorer;
  /** No confirmed message in it: hold everything. */
  readonly isEmpty: boolean;
  /** The desk as of this version: queues that were renamed, merged or retired are replaced. Decide with this one. */
  readonly desk: Desk;
  /** Why there is a model that cannot be used (it counts another schema); null otherwise. `isEmpty` is true then. */
  readonly fault: Fault | null;
  readonly parts: LoadedParts;
}

/** What was read, so that the next load reads only what is new. */
export interface LoadedParts {
  /** Null: there was no manifest. */
  readonly etag: string | null;
  readonly manifest: Manifest;
  /** As the desk's file has it. */
  readonly desk: Desk;
  readonly schema: string;
  readonly table: { readonly id: string | null; readonly value: ServedTable };
  readonly segments: ReadonlyMap<string, readonly Entry[]>;
}

/** The model as last committed; `cached` itself when nothing changed, for one conditional read. Immutable objects are read
 *  once. When the manifest names what a compaction deleted meanwhile, the manifest is read again.
 *  Throws TallypostError `object-missing`, `object-damaged` and what the model's codecs refuse; the store's failures. */
export async function loadModel(
  world: World,
  desk: Desk,
  schema: Schema,
  cached: LoadedModel | null,
): Promise<LoadedModel> {
  const usable = cached?.parts.schema === schema.id ? cached : null;
  return withFresh(async (attempt) => {
    const etag = attempt === 0 ? usable?.parts.etag : null;
    const got = await world.store.get(keys.manifest, {
      bytesMax: bounds.ledgerJsonBytesMax,
      ...(etag ? { ifNoneMatch: etag } : {}),
    });
    if (got.kind === 'not-modified' && usable)
      return sameDesk(usable, desk) ? usable : build({ ...usable.parts, desk }, schema);
    if (got.kind !== 'found') {
      if (usable && usable.parts.etag === null && sameDesk(usable, desk)) return usable;
      return build(emptyParts(desk, schema, null, emptyManifest), schema);
    }
    const manifest = decodeManifest(got.object.body, keys.manifest);
    if (manifest.schema !== '' && manifest.schema !== schema.id)
      return build(emptyParts(desk, schema, got.object.etag, manifest), schema);
    return build(
      await readParts(world, desk, schema, got.object.etag, manifest, usable?.parts ?? null),
      schema,
    );
  });
}

async function readParts(
  world: World,
  desk: Desk,
  schema: Schema,
  etag: string,
  manifest: Manifest,
  held: LoadedParts | null,
): Promise<LoadedParts> {
  const isHeld =
    held !== null && held.table.id === manifest.table && held.manifest.schema === manifest.schema;
  const table = isHeld
    ? held.table
    : { id: manifest.table, value: await readTable(world, schema, manifest.table) };
  const segments = await mapBounded(
    manifest.segments,
    async ({ id }): Promise<[string, readonly Entry[]]> => [
      id,
      held?.segments.get(id) ?? (await readSegment(world, schema, id)),
    ],
  );
  return { etag, manifest, desk, schema: schema.id, table, segments: new Map(segments) };
}

function emptyParts(desk: Desk, schema: Schema, etag: string | null, manifest: Manifest): LoadedParts {
  return {
    etag,
    manifest,
    desk,
    schema: schema.id,
    table: { id: null, value: emptyTable(schema) },
    segments: new Map(),
  };
}

function build(parts: LoadedParts, schema: Schema): LoadedModel {
  const { manifest, table, segments } = parts;
  const { renames } = manifest;
  const desk = currentDesk(parts.desk, renames);
  const queues = desk.queues.map((q) => q.id);
  const guard = createBurstGuard(table.value.bursts);
  const overlay = [...segments.values()].flat().map((entry) => renamed(guard.admit(entry), renames));
  // The half-life that the table was made with: another one in the desk's file holds from the next compaction on.
  const scorer = createScorer(table.value, overlay, queues, table.value.halfLifeDays);
  const isOther = manifest.schema !== '' && manifest.schema !== schema.id;
  return {
    version: manifest.version,
    scorer,
    isEmpty: scorer.messages.every((c) => c <= 0),
    desk,
    fault: isOther
      ? {
          code: 'schema-mismatch',
          place: keys.manifest,
          expected: `schema ${schema.id} of the desk's file`,
          got: `schema ${manifest.schema}; count again with the new one`,
        }
      : null,
    parts,
  };
}

/** The base's table has today's names already: it is made anew with every change of a queue. Segments keep what was confirmed. */
export function renamed(entry: Entry, renames: Manifest['renames']): Entry {
  const { minus, plus } = entry;
  return {
    ...entry,
    minus: minus && { ...minus, queue: currentName(renames, minus.queue) },
    plus: plus && { ...plus, queue: currentName(renames, plus.queue) },
  };
}

function sameDesk({ parts }: LoadedModel, desk: Desk): boolean {
  return parts.desk === desk || JSON.stringify(parts.desk) === JSON.stringify(desk);
}
