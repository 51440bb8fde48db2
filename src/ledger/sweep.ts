import { bounds } from '../bounds.ts';
import { createAbsorbedReader } from './absorbed.ts';
import { commit, readManifest } from './commit.ts';
import { isTombstone, settle } from './history.ts';
import { editHistory, listMessages } from './history-store.ts';
import { successor } from './manifest.ts';
import { mapBounded } from './pace.ts';
import type { World } from './world.ts';

/** Writes into the histories what a restore took back; until then every reader works it out from the manifest. When all are
 *  written, the manifest forgets the segments that were rolled back. True when all of it is done. */
export async function sweepHistories(world: World): Promise<boolean> {
  const { manifest } = await readManifest(world);
  const dead = new Set(manifest.rolledBack);
  if (dead.size === 0) return true;
  const hasAbsorbed = await createAbsorbedReader(world)(manifest);
  let isDone = true;
  let chunk: string[] = [];
  const write = async () => {
    const edits = await mapBounded(chunk, (message) =>
      editHistory(world, message, null, (stored) => {
        if (stored === null || isTombstone(stored)) return { next: null, value: null };
        const { confirmations, landed, open, isChanged } = settle(stored, manifest, hasAbsorbed, null);
        if (!isChanged) return { next: null, value: null };
        const placements = open ? [...landed, open] : landed;
        return { next: { ...stored, rev: stored.rev + 1, confirmations, placements }, value: null };
      }),
    );
    if (edits.some((edited) => edited.kind === 'unknown')) isDone = false;
    chunk = [];
  };
  for await (const message of listMessages(world)) {
    chunk.push(message);
    if (chunk.length >= bounds.recountChunkMax) await write();
  }
  await write();
  if (!isDone) return false;
  const forgotten = await commit(world, async (now) => {
    const rolledBack = now.rolledBack.filter((id) => !dead.has(id));
    if (rolledBack.length === now.rolledBack.length) return { kind: 'settled', value: null };
    return { kind: 'write', next: successor(now, world.nowMs(), { rolledBack }), value: null };
  });
  return forgotten.kind === 'known';
}
