import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import { TallypostError } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { encodeTable } from '../model/codec-table.ts';
import { keys } from '../store/keys.ts';
import { readAbsorbed } from './absorbed.ts';
import { commit, readManifest } from './commit.ts';
import { checkSchema, decodeManifest, type Manifest, successor } from './manifest.ts';
import { putNew, readBase, readTable } from './objects.ts';
import { closeOrder, placeOrder } from './orders.ts';
import { archive, makeTable, newBaseId } from './rebuild.ts';
import { sweepHistories } from './sweep.ts';
import type { World } from './world.ts';

export interface RestoreResult {
  readonly kind: 'restored' | 'nothing-to-do' | 'lost-race' | 'unfinished' | 'dry-run';
  /** Of the manifest now. */
  readonly version: number;
  readonly to: number;
  /** Segments taken back: all that landed since. */
  readonly segments: number;
}

/** Returns the counts to what they were at an earlier version: all that landed since is taken back, and the histories say so, so
 *  that a recount agrees and repeated deliveries change nothing. One compare-and-set; readers see the old state or the new
 *  one. Confirmations that changed no count (they were outranked, or said the same again) stay on record. What is being
 *  folded starts again on the restored counts. Names of queues stay as they are now.
 *  Throws TallypostError `version-unknown` for a version that does not exist, is past the horizon, lies before an erasure
 *  (its objects hold what was erased), or was itself taken back by a restore. */
export async function restoreVersion(
  world: World,
  desk: Desk,
  schema: Schema,
  to: number,
  options: { readonly dryRun?: boolean } = {},
): Promise<RestoreResult> {
  const { manifest: before } = await readManifest(world);
  checkSchema(before, schema);
  checkReachable(before, to);
  const id = newBaseId(world, before);
  const target = to === before.version ? before : await manifestAt(world, before, to);
  checkSchema(target, schema);
  const gone = await landedSince(world, target, before);
  const outcome = { version: before.version, to, segments: gone.size };
  if (gone.size === 0 && target.base === before.base) return { kind: 'nothing-to-do', ...outcome };
  if (options.dryRun) return { kind: 'dry-run', ...outcome };
  const table = await tableFor(world, desk, schema, target, before, id);
  const order = await placeOrder(world, { kind: 'sweep', atMs: world.nowMs() });
  const committed = await commit<boolean>(world, async (manifest) => {
    if (manifest.restores.some((r) => r.id === id)) return { kind: 'settled', value: true };
    if (manifest.version !== before.version) return { kind: 'settled', value: false };
    await archive(world, manifest);
    const version = manifest.version + 1;
    const next = successor(manifest, world.nowMs(), {
      base: target.base,
      table,
      absorbed: target.absorbed,
      segments: target.segments,
      rolledBack: [...manifest.rolledBack, ...gone],
      restores: [...manifest.restores, { id, version, to }],
      shapedAtVersion: version,
    });
    return { kind: 'write', next, value: true, gone, back: new Set(target.segments.map((s) => s.id)) };
  });
  if (committed.kind === 'unknown') return { kind: 'unfinished', ...outcome };
  const { version } = committed.manifest;
  if (!committed.value) return { kind: 'lost-race', ...outcome, version };
  const isDone = await sweepHistories(world);
  if (isDone) await closeOrder(world, order);
  return { kind: isDone ? 'restored' : 'unfinished', ...outcome, version };
}

function checkReachable(now: Manifest, to: number): void {
  const oldest = Math.max(now.oldestVersion, now.erasedAtVersion);
  const takenBack = now.restores.find((r) => to > r.to && to < r.version);
  if (Number.isSafeInteger(to) && to >= oldest && to <= now.version && !takenBack) return;
  throw unknownVersion(
    to,
    takenBack ? `outside ${takenBack.to + 1} to ${takenBack.version - 1}` : `${oldest} to ${now.version}`,
  );
}

function unknownVersion(to: number, expected: string): TallypostError {
  return new TallypostError({
    code: 'version-unknown',
    place: keys.manifest,
    expected: `a version that can be restored, ${expected}`,
    got: String(to),
  });
}

/** The manifest as it was at version `to`: the first one archived since tells it, by the landing versions of its segments. */
async function manifestAt(world: World, now: Manifest, to: number): Promise<Manifest> {
  let found: Manifest = now;
  for await (const { key } of world.store.list(keys.versions)) {
    if (Number(key.slice(keys.versions.length).split('-')[0]) < to) continue;
    const got = await world.store.get(key, { bytesMax: bounds.ledgerJsonBytesMax });
    if (got.kind === 'found') found = decodeManifest(got.object.body, key);
    break;
  }
  if (found.shapedAtVersion > to) throw unknownVersion(to, `${found.shapedAtVersion} or later`);
  return { ...found, segments: found.segments.filter((s) => s.version <= to) };
}

async function landedSince(world: World, target: Manifest, now: Manifest): Promise<Set<string>> {
  const kept = new Set([
    ...target.segments.map((s) => s.id),
    ...(await readAbsorbed(world, target.absorbed)),
  ]);
  const landed = [...now.segments.map((s) => s.id), ...(await readAbsorbed(world, now.absorbed))];
  return new Set(landed.filter((id) => !kept.has(id)));
}

/** The target's own table, or one made anew from its base when queues were renamed since. */
async function tableFor(
  world: World,
  desk: Desk,
  schema: Schema,
  target: Manifest,
  now: Manifest,
  id: string,
): Promise<string | null> {
  if (target.base === null || JSON.stringify(target.renames) === JSON.stringify(now.renames))
    return target.table;
  const counts = await readBase(world, schema, target.base);
  const { table } = await makeTable(world, desk, schema, target, counts, {
    renames: now.renames,
    fitModel: null,
    bursts: (await readTable(world, schema, target.table)).bursts,
  });
  await putNew(world, keys.tables + id, encodeTable(table));
  return id;
}
