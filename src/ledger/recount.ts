import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import { type Fault, TallypostError } from '../errors.ts';
import type { Features, Schema } from '../features/schema.ts';
import { type Bursts, createBurstGuard, noBursts } from '../model/bursts.ts';
import { decodeFeatures, encodeFeatures } from '../model/codec-entries.ts';
import type { CellDifference, EncodedCounts, Entry } from '../model/counts.ts';
import { diffCounts } from '../model/difference.ts';
import { createTally } from '../model/tally.ts';
import { keys } from '../store/keys.ts';
import { createAbsorbedReader, type HasAbsorbed } from './absorbed.ts';
import { readManifest } from './commit.ts';
import { columnAsOf, type History, isTombstone, type Stored } from './history.ts';
import { editHistory, historyKey, listMessages, readHistory } from './history-store.ts';
import { isOutdated, type Manifest } from './manifest.ts';
import { readCounts, withFresh } from './objects.ts';
import { faultOf, mapBounded, pause } from './pace.ts';
import { type FitModel, newBaseId, rebuild } from './rebuild.ts';
import type { World } from './world.ts';

export interface RecountOptions {
  /** Replaces the base by what the histories say when they differ, or when the base cannot be read, or counts another schema. */
  readonly repair?: boolean;
  /** Differences listed at most; all are counted up to it. */
  readonly differencesMax?: number;
  /** Reads a message again under a new schema; null when its raw form is gone. Needed only after the schema changed. */
  readonly reread?: (message: string) => Promise<Features | null>;
  readonly fitModel?: FitModel;
}

export interface RecountResult {
  /** Of the manifest that was compared. */
  readonly version: number;
  /** Histories that stand in the counts. */
  readonly messages: number;
  /** Cell by cell: `left` is the table, `right` the recount. */
  readonly differences: readonly CellDifference[];
  /** Why the table could not be read or compared; null when it could. */
  readonly fault: Fault | null;
  /** Messages that are left out under the new schema, since their raw form is gone. */
  readonly unread: number;
  /** `lost-race`: something landed during each of the attempts; nothing was changed. */
  readonly repair: 'none' | 'not-needed' | 'repaired' | 'lost-race';
}

/** Counts every history again from scratch and compares with the table, cell by cell, both as of one version; what is folded
 *  meanwhile changes neither. With `repair` the recount becomes the base. Reads every history once. */
export function recount(
  world: World,
  desk: Desk,
  schema: Schema,
  options: RecountOptions = {},
): Promise<RecountResult> {
  return withFresh(() => recountUndisturbed(world, desk, schema, options));
}

async function recountUndisturbed(
  world: World,
  desk: Desk,
  schema: Schema,
  options: RecountOptions,
): Promise<RecountResult> {
  for (let attempt = 0; ; attempt++) {
    if (attempt > 0) await pause(world, attempt);
    const { manifest } = await readManifest(world);
    const id = newBaseId(world, manifest);
    const isMigration = manifest.schema !== '' && manifest.schema !== schema.id;
    const reread = isMigration && options.repair ? (options.reread ?? (async () => null)) : null;
    const { counts, bursts, messages, unread } = await countHistories(
      world,
      schema,
      manifest,
      reread,
      options.repair ?? false,
    );
    const { table, fault } = await readTableCounts(world, schema, manifest);
    const { manifest: after } = await readManifest(world);
    // An erasure or a restore meanwhile changed what the histories say of the version compared; a compaction may have deleted
    // what it named.
    const isGone = fault?.code === 'object-missing' && after.version !== manifest.version;
    const isDisturbed = after.erasedAtVersion > manifest.version || isOutdated(after, manifest.version);
    const isLastAttempt = attempt + 1 >= bounds.recountAttemptsMax;
    if (isGone || isDisturbed) {
      if (!isLastAttempt) continue;
      const found = { version: manifest.version, messages, differences: [], fault: disturbed, unread };
      return { ...found, repair: options.repair ? 'lost-race' : 'none' };
    }
    const max = options.differencesMax ?? bounds.faultsListedMax;
    const differences = table && !hasSameBytes(table, counts) ? diffCounts(table, counts, max) : [];
    const found = { version: manifest.version, messages, differences, fault, unread };
    const isRight = fault === null && differences.length === 0;
    if (!options.repair) return { ...found, repair: 'none' };
    if (isRight) return { ...found, repair: 'not-needed' };
    // Nothing may land between a count under a new schema and its commit: what was folded with the old features is not in it.
    const isInTime = !isMigration || after.version === manifest.version;
    const isCommitted = isInTime && (await replaceBase());
    if (isCommitted) return { ...found, repair: 'repaired' };
    if (isLastAttempt) return { ...found, repair: 'lost-race' };

    async function replaceBase(): Promise<boolean> {
      const rebuilt = await rebuild(world, desk, schema, manifest, counts, {
        id,
        renames: manifest.renames,
        bursts,
        fitModel: options.fitModel ?? null,
        isExclusive: isMigration,
      });
      return rebuilt.isCommitted;
    }
  }
}

/** No pass went by without an erasure or a restore: nothing was compared, and nothing may be built on what was counted. */
const disturbed: Fault = {
  code: 'contended',
  place: keys.manifest,
  expected: 'one recount without an erasure or a restore',
  got: `one during each of ${bounds.recountAttemptsMax}`,
};

/** Equal counts have equal bytes. */
function hasSameBytes(a: EncodedCounts, b: EncodedCounts): boolean {
  return Buffer.compare(a.bytes, b.bytes) === 0;
}

type Reread = NonNullable<RecountOptions['reread']>;

/** What the histories say of the counts at `manifest`. `reread`: gives features to those that have none of this schema. */
async function countHistories(
  world: World,
  schema: Schema,
  manifest: Manifest,
  reread: Reread | null,
  isForRepair: boolean,
): Promise<{ counts: EncodedCounts; bursts: Bursts; messages: number; unread: number }> {
  const hasAbsorbed = await createAbsorbedReader(world)(manifest);
  const tally = createTally(schema);
  const guard = isForRepair ? createBurstGuard(noBursts(schema)) : null;
  let [messages, unread] = [0, 0];
  let chunk: string[] = [];
  const add = async () => {
    const entries = await mapBounded(chunk, async (message) => {
      const { stored } = await readHistory(world, message);
      if (stored === null || isTombstone(stored)) return null;
      const isKnown = Object.hasOwn(stored.features, schema.id);
      const read = isKnown || reread === null ? stored : await addFeatures(world, schema, message, reread);
      if (read === null) unread += 1;
      return read && entryOf(schema, manifest, hasAbsorbed, read);
    });
    const standing = entries.filter((e) => e !== null);
    messages += standing.length;
    tally.add(standing);
    if (guard !== null) for (const entry of standing) guard.admit(entry);
    chunk = [];
  };
  for await (const message of listMessages(world)) {
    chunk.push(message);
    if (chunk.length >= bounds.recountChunkMax) await add();
  }
  await add();
  return {
    counts: tally.sum(null, 'recount'),
    bursts: guard?.bursts() ?? noBursts(schema),
    messages,
    unread,
  };
}

function entryOf(
  schema: Schema,
  manifest: Manifest,
  hasAbsorbed: HasAbsorbed,
  history: History,
): Entry | null {
  if (!Object.hasOwn(history.features, schema.id)) return null;
  const plus = columnAsOf(history, manifest, hasAbsorbed);
  if (plus === null) return null;
  const features = decodeFeatures(history.features[schema.id], schema, historyKey(history.message));
  return { features, said: history.said, minus: null, plus };
}

async function readTableCounts(
  world: World,
  schema: Schema,
  manifest: Manifest,
): Promise<{ table: EncodedCounts | null; fault: Fault | null }> {
  try {
    return { table: await readCounts(world, schema, manifest), fault: null };
  } catch (error) {
    if (!(error instanceof TallypostError) || error.code.startsWith('store-')) throw error;
    return { table: null, fault: faultOf(error, '') };
  }
}

/** Adds features of the new schema to a history, beside the old ones: until the manifest turns to the new schema, nothing
 *  else changes. Gives the history as it is then; null when its message cannot be read. */
async function addFeatures(
  world: World,
  schema: Schema,
  message: string,
  reread: Reread,
): Promise<History | null> {
  const features = await reread(message);
  if (features === null) return null;
  const encoded = encodeFeatures(features);
  const edited = await editHistory<Stored | null>(world, message, null, (now) => {
    if (now === null || isTombstone(now) || Object.hasOwn(now.features, schema.id))
      return { next: null, value: now };
    const next: History = { ...now, rev: now.rev + 1, features: { ...now.features, [schema.id]: encoded } };
    return { next, value: next };
  });
  if (edited.kind === 'unknown') throw new TallypostError(edited.fault);
  return edited.value === null || isTombstone(edited.value) ? null : edited.value;
}
