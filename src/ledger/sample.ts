import { bounds } from '../bounds.ts';
import type { Schema } from '../features/schema.ts';
import { decodeFeatures } from '../model/codec-entries.ts';
import type { FoldedMessage } from '../model/fit-table.ts';
import { createAbsorbedReader } from './absorbed.ts';
import { columnAsOf, isTombstone } from './history.ts';
import { historyKey, listMessages, readHistory } from './history-store.ts';
import type { Manifest, Renames } from './manifest.ts';
import { mapBounded } from './pace.ts';
import { currentName } from './queue-names.ts';
import type { World } from './world.ts';

export interface SampledMessage extends FoldedMessage {
  readonly message: string;
}

/** Messages that stand in the counts of `manifest`, at most `fitSampleMax`: those whose id hashes lowest under the manifest's
 *  version, so that the same state gives the same sample and each night draws another. One list, one read a message. */
export async function sampleHistories(
  world: World,
  schema: Schema,
  manifest: Manifest,
  renames: Renames,
): Promise<SampledMessage[]> {
  const drawn: { message: string; lot: number }[] = [];
  for await (const message of listMessages(world)) {
    drawn.push({ message, lot: lotOf(`${manifest.version} ${message}`) });
    if (drawn.length >= 4 * bounds.fitSampleMax) keepLowest(drawn);
  }
  keepLowest(drawn);
  const hasAbsorbed = await createAbsorbedReader(world)(manifest);
  const sample = await mapBounded(drawn, async ({ message }): Promise<SampledMessage | null> => {
    const { stored } = await readHistory(world, message);
    if (stored === null || isTombstone(stored) || !Object.hasOwn(stored.features, schema.id)) return null;
    const column = columnAsOf(stored, manifest, hasAbsorbed);
    if (column === null) return null;
    const features = decodeFeatures(stored.features[schema.id], schema, historyKey(message));
    return { message, features, queue: currentName(renames, column.queue), epoch: column.epoch };
  });
  return sample.filter((m) => m !== null);
}

function keepLowest(drawn: { message: string; lot: number }[]): void {
  drawn.sort((a, b) => a.lot - b.lot || (a.message < b.message ? -1 : 1));
  drawn.length = Math.min(drawn.length, bounds.fitSampleMax);
}

/** FNV-1a, 32 bits, finished by an avalanche so that ids which differ at their end do not keep their order. */
function lotOf(text: string): number {
  let h = 0x811c9dc5;
  for (let i = 0; i < text.length; i++) h = Math.imul(h ^ text.charCodeAt(i), 0x01000193);
  h = Math.imul(h ^ (h >>> 16), 0x85ebca6b);
  h = Math.imul(h ^ (h >>> 13), 0xc2b2ae35);
  return (h ^ (h >>> 16)) >>> 0;
}
