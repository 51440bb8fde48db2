import { bounds } from '../bounds.ts';
import { keys } from '../store/keys.ts';
import { commit, readManifest } from './commit.ts';
import { firstIdAt, laterOf } from './ids.ts';
import { decodeManifest, type Manifest, successor } from './manifest.ts';
import { mapBounded } from './pace.ts';
import type { World } from './world.ts';

const immutable = [keys.bases, keys.tables, keys.absorbed, keys.segments] as const;

/** Deletes what no manifest within the horizon names, in this order: the manifest's floor and its oldest version rise, so that
 *  nothing below the floor can land any more; then what is named is read, by the manifest and by every one that can still be
 *  restored; then the rest is deleted. What is named later is above the floor or was named then. Gives the number deleted.
 *  Repeating it is harmless; what a crash leaves goes the next time. */
export async function deleteUnnamed(world: World, isDryRun = false): Promise<number> {
  const { manifest: before } = await readManifest(world);
  const cut = firstIdAt(world.nowMs() - bounds.horizonMs);
  const expired = (await listArchives(world)).filter((a) => a.id < cut).map((a) => a.version + 1);
  const limits = {
    floor: laterOf(before.floor, cut),
    oldestVersion: Math.max(before.oldestVersion, ...expired),
  };
  const likely = await findUnnamed(world, { ...before, ...limits });
  if (likely.length === 0 || isDryRun) return likely.length;
  const raised = await commit(world, async (manifest) => {
    const floor = laterOf(manifest.floor, limits.floor);
    const oldestVersion = Math.max(manifest.oldestVersion, limits.oldestVersion);
    if (manifest.floor === floor && manifest.oldestVersion === oldestVersion)
      return { kind: 'settled', value: null };
    const voided = manifest.voided.filter((id) => id >= floor);
    return {
      kind: 'write',
      next: successor(manifest, world.nowMs(), { floor, oldestVersion, voided }),
      value: null,
    };
  });
  if (raised.kind === 'unknown') return 0;
  const doomed = await findUnnamed(world, raised.manifest);
  await mapBounded(doomed, (key) => world.store.delete(key));
  return doomed.length;
}

interface Archived {
  readonly key: string;
  readonly version: number;
  /** Made when it was superseded. */
  readonly id: string;
}

async function listArchives(world: World): Promise<Archived[]> {
  const found: Archived[] = [];
  for await (const { key } of world.store.list(keys.versions)) {
    const [version, ...id] = key.slice(keys.versions.length).split('-');
    found.push({ key, version: Number(version), id: id.join('-') });
  }
  return found;
}

/** Archives that cannot be restored any more, and objects below the floor or void that neither `manifest` nor a manifest
 *  that can be restored names. */
async function findUnnamed(world: World, manifest: Manifest): Promise<string[]> {
  const archives = await listArchives(world);
  const named = namesOf(manifest);
  await mapBounded(
    archives.filter((a) => a.version >= manifest.oldestVersion),
    async ({ key }) => {
      const got = await world.store.get(key, { bytesMax: bounds.ledgerJsonBytesMax });
      if (got.kind === 'found')
        for (const name of namesOf(decodeManifest(got.object.body, key))) named.add(name);
    },
  );
  const unnamed = archives.filter((a) => a.version < manifest.oldestVersion).map((a) => a.key);
  const isVoidNow = new Set(manifest.voided);
  for (const prefix of immutable)
    for await (const { key } of world.store.list(prefix)) {
      const id = key.slice(prefix.length);
      const isOver = id < manifest.floor || (prefix === keys.segments && isVoidNow.has(id));
      if (isOver && !named.has(key)) unnamed.push(key);
    }
  return unnamed;
}

function namesOf({ base, table, absorbed, segments }: Manifest): Set<string> {
  return new Set([
    ...(base ? [keys.bases + base] : []),
    ...(table ? [keys.tables + table] : []),
    ...(absorbed ? [keys.absorbed + absorbed] : []),
    ...segments.map(({ id }) => keys.segments + id),
  ]);
}
