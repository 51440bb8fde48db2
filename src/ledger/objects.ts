import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { type Bursts, createBurstGuard, noBursts } from '../model/bursts.ts';
import { decodeEntries } from '../model/codec-entries.ts';
import { decodeTable } from '../model/codec-table.ts';
import type { EncodedCounts, Entry } from '../model/counts.ts';
import { openCounts } from '../model/encoded.ts';
import { emptyTable, type ServedTable } from '../model/served-table.ts';
import { sumCounts } from '../model/sum-counts.ts';
import { createTally } from '../model/tally.ts';
import { keys } from '../store/keys.ts';
import { missing } from './absorbed.ts';
import type { Manifest } from './manifest.ts';
import { faultOf, isLasting, isOfStore, mapBounded, pause } from './pace.ts';
import type { World } from './world.ts';

/** The immutable objects that a manifest names. All throw TallypostError: `object-missing`, and what the codec refuses. */

export async function readTable(world: World, schema: Schema, id: string | null): Promise<ServedTable> {
  if (id === null) return emptyTable(schema);
  return decodeTable(await readBytes(world, keys.tables + id), schema, keys.tables + id);
}

export async function readBase(world: World, schema: Schema, id: string | null): Promise<EncodedCounts> {
  if (id === null) return sumCounts(schema, [], 'no base');
  return openCounts(await readBytes(world, keys.bases + id), schema, keys.bases + id);
}

export async function readSegment(world: World, schema: Schema, id: string): Promise<Entry[]> {
  return decodeEntries(await readBytes(world, keys.segments + id), schema, keys.segments + id);
}

/** The counts as a manifest has them: its base with all its segments. Exact, all epochs, the names that were confirmed. Takes the
 *  room of two bases, however many the segments: they are read some at a time. `see` is called for each entry, in order. */
export async function readCounts(
  world: World,
  schema: Schema,
  { base, segments }: Pick<Manifest, 'base' | 'segments'>,
  see: (entry: Entry) => void = () => {},
): Promise<EncodedCounts> {
  const counts = await readBase(world, schema, base);
  if (segments.length === 0) return counts;
  const tally = createTally(schema);
  for (let at = 0; at < segments.length; at += bounds.requestsAtOnceMax) {
    const some = segments.slice(at, at + bounds.requestsAtOnceMax);
    const read = await mapBounded(some, ({ id }) => readSegment(world, schema, id));
    for (const entries of read) {
      tally.add(entries);
      entries.forEach(see);
    }
  }
  return tally.sum(counts, `base ${base ?? 'none'} with ${segments.length} segments`);
}

/** The counts as a manifest has them, and what of them is a burst's excess: the last table's, led on by the segments. */
export async function readCapped(
  world: World,
  schema: Schema,
  manifest: Manifest,
): Promise<{ readonly counts: EncodedCounts; readonly bursts: Bursts }> {
  const isSame = manifest.schema === schema.id;
  const before = isSame ? (await readTable(world, schema, manifest.table)).bursts : noBursts(schema);
  const guard = createBurstGuard(before);
  const counts = await readCounts(world, schema, manifest, (entry) => guard.admit(entry));
  return { counts, bursts: guard.bursts() };
}

async function readBytes(world: World, key: string): Promise<Uint8Array> {
  const got = await world.store.get(key, { bytesMax: bounds.modelBytesMax });
  if (got.kind !== 'found') throw missing(key);
  return got.object.body;
}

/** Puts an object under a name of its own, until it is certain to be there. Throws the store's last failure. */
export async function putNew(world: World, key: string, body: Uint8Array): Promise<void> {
  for (let attempt = 1; ; attempt++) {
    try {
      // `lost`: it stands there, by an attempt whose answer was lost; or another write of it is under way.
      const put = await world.store.put(key, body, { ifNoneMatch: '*' });
      if (put.kind === 'written' || (await world.store.head(key)) !== null) return;
    } catch (error) {
      const isHopeless = !isOfStore(error) || isLasting(faultOf(error, key));
      if (isHopeless || attempt >= bounds.writeAttemptsMax) throw error;
    }
    if (attempt >= bounds.writeAttemptsMax)
      throw new TallypostError({
        code: 'store-busy',
        place: key,
        expected: 'a written object',
        got: 'a lost race',
      });
    await pause(world, attempt);
  }
}

/** Runs `work` again with what the manifest names now when something was deleted meanwhile; an object that stays missing is an
 *  error. */
export async function withFresh<T>(work: (attempt: number) => Promise<T>): Promise<T> {
  for (let attempt = 0; ; attempt++) {
    try {
      return await work(attempt);
    } catch (error) {
      const isGone = error instanceof TallypostError && error.code === 'object-missing';
      if (!isGone || attempt >= 3) throw error;
    }
  }
}
