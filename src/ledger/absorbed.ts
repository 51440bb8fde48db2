import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import { keys } from '../store/keys.ts';
import { isId } from './ids.ts';
import type { Manifest } from './manifest.ts';
import type { World } from './world.ts';

/** Whether a segment is in the base. */
export type HasAbsorbed = (segment: string) => boolean;

/** Reads the list of absorbed segments, once for each list: it is immutable. */
export function createAbsorbedReader(world: World): (manifest: Manifest) => Promise<HasAbsorbed> {
  let held: { readonly id: string; readonly ids: ReadonlySet<string> } | null = null;
  return async ({ absorbed }) => {
    if (absorbed === null) return () => false;
    if (held?.id !== absorbed) held = { id: absorbed, ids: new Set(await readAbsorbed(world, absorbed)) };
    const { ids } = held;
    return (segment) => ids.has(segment);
  };
}

/** Ids of all segments ever absorbed, ascending. Kept for good, 23 bytes each: what a history says of a segment can be
 *  decided at any time, whatever the clocks say. */
export async function readAbsorbed(world: World, id: string | null): Promise<string[]> {
  if (id === null) return [];
  const key = keys.absorbed + id;
  const got = await world.store.get(key, { bytesMax: bounds.absorbedBytesMax });
  if (got.kind !== 'found') throw missing(key);
  const ids = new TextDecoder().decode(got.object.body).split('\n').slice(0, -1);
  if (!ids.every(isId) || !got.object.body.subarray(-1).every((b) => b === 0x0a))
    throw new TallypostError({
      code: 'object-damaged',
      place: key,
      expected: 'one segment id a line',
      got: `${got.object.bytes} other bytes`,
    });
  return ids;
}

export function encodeAbsorbed(ids: Iterable<string>): Uint8Array {
  return new TextEncoder().encode(
    [...ids]
      .sort()
      .map((id) => `${id}\n`)
      .join(''),
  );
}

/** The manifest names what is not there: it was replaced meanwhile, or the store lost an object. */
export function missing(key: string): TallypostError {
  return new TallypostError({
    code: 'object-missing',
    place: key,
    expected: 'the object that the manifest names',
    got: 'nothing',
  });
}
