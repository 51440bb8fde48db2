import { bounds } from '../bounds.ts';
import { keys } from '../store/keys.ts';
import { commit, readManifest } from './commit.ts';
import { firstIdAt, laterOf } from './ids.ts';
import { decodeManifest, type Manifest, successor } from './manifest.ts';
import { mapBounded } from './pace.ts';
import type { World } from './world.ts';

const immutable = [keys.bases, keys.tables, keys.absorbed, keys.segments] as const;

/** Deletes what no manifest within the horizon names. The manifest first says so (its floor and its oldest version rise), so
 *  that no segment below the floor can land and no restore can name what is being deleted; then the objects go. Gives the
 *  number deleted. Repeating it is harmless; what a crash leaves goes the next time. */
export async function deleteUnnamed(world: World, isDryRun = false): Promise<number> {
  const { manifest: before } = await readManifest(world);
  const cut = firstIdAt(world.nowMs() - bounds.horizonMs);
  const floor = laterOf(before.floor, cut);
  const versions: { key: string; version: number; id: string }[] = [];
  for await (const { key } of world.store.list(keys.versions)) {
    const [version, ...id] = key.slice(keys.versions.length).split('-');
    versions.push({ key, version: Number(version), id: id.join('-') });
  }
  const expired = versions.filter((v) => v.id < cut).map((v) => v.version + 1);
  const oldest = Math.max(before.oldestVersion, ...expired);
  const kept = namesOf(before);
  await mapBounded(
    versions.filter((v) => v.version >= oldest),
    async ({ key }) => {
      const got = await world.store.get(key, { bytesMax: bounds.ledgerJsonBytesMax });
      if (got.kind === 'found')
        for (const name of namesOf(decodeManifest(got.object.body, key))) kept.add(name);
    },
  );
  const doomed = versions.filter((v) => v.version < oldest).map((v) => v.key);
  const isVoidNow = new Set(before.voided);
  for (const prefix of immutable)
    for await (const { key } of world.store.list(prefix)) {
      const id = key.slice(prefix.length);
      if (!kept.has(key) && (id < floor || (prefix === keys.segments && isVoidNow.has(id)))) doomed.push(key);
    }
  if (doomed.length === 0 || isDryRun) return doomed.length;
  const raised = await commit(world, async (manifest) => {
    if (manifest.floor >= floor && manifest.oldestVersion >= oldest) return { kind: 'settled', value: null };
    const next = successor(manifest, world.nowMs(), {
      floor: laterOf(manifest.floor, floor),
      oldestVersion: Math.max(manifest.oldestVersion, oldest),
      voided: manifest.voided.filter((id) => id >= floor),
    });
    return { kind: 'write', next, value: null };
  });
  if (raised.kind === 'unknown') return 0;
  const named = namesOf(raised.manifest);
  const doomedNow = doomed.filter((key) => !named.has(key));
  await mapBounded(doomedNow, (key) => world.store.delete(key));
  return doomedNow.length;
}

function namesOf({ base, table, absorbed, segments }: Manifest): Set<string> {
  return new Set([
    ...(base ? [keys.bases + base] : []),
    ...(table ? [keys.tables + table] : []),
    ...(absorbed ? [keys.absorbed + absorbed] : []),
    ...segments.map(({ id }) => keys.segments + id),
  ]);
}
