import type { Desk } from '../desk/desk.ts';
import type { Schema } from '../features/schema.ts';
import { type Bursts, memberKey } from '../model/bursts.ts';
import { checkCounts } from '../model/check-counts.ts';
import { encodeTable } from '../model/codec-table.ts';
import type { CountsView, EncodedCounts } from '../model/counts.ts';
import { defaultFit, type Fit } from '../model/fit.ts';
import type { FitFindings, fitFindings } from '../model/fit-table.ts';
import { type ServedTable, serve } from '../model/served-table.ts';
import { sumCounts } from '../model/sum-counts.ts';
import { keys } from '../store/keys.ts';
import { encodeAbsorbed, readAbsorbed } from './absorbed.ts';
import { commit } from './commit.ts';
import { laterOf, newId } from './ids.ts';
import { encodeManifest, isNamed, isPurgeDue, type Manifest, type Renames, successor } from './manifest.ts';
import { putNew, readTable } from './objects.ts';
import { isOfStore } from './pace.ts';
import { currentName } from './queue-names.ts';
import { type SampledMessage, sampleHistories } from './sample.ts';
import type { World } from './world.ts';

/** Fits what routers load from the counts by queue, a sample of the messages in them, and the last fit. */
export type FitModel = (...args: Parameters<typeof fitFindings>) => Fit | FitFindings;

/** A table, and what was found on the way. */
export interface MadeTable {
  readonly table: ServedTable;
  /** Exact, all epochs, columns by today's names of queues: those of merged queues stand side by side. */
  readonly byQueue: CountsView;
  readonly contradictions: readonly ContradictedMessage[];
}

/** A confirmation that all other messages contradict: worth a second look. */
export interface ContradictedMessage {
  readonly message: string;
  readonly queue: string;
  /** Of that queue, told by all other messages. */
  readonly probability: number;
  readonly likelier: string;
  readonly likelierProbability: number;
}

export interface RebuildOptions {
  /** From `newBaseId`, made as soon as the manifest was read. */
  readonly id: string;
  readonly renames: Renames;
  /** Null: keep the last fit. */
  readonly fitModel: FitModel | null;
  /** Of the counts: what routers are not to count. */
  readonly bursts: Bursts;
  /** Lands only on the very version that was read: nothing may land meanwhile. */
  readonly isExclusive?: boolean;
}

export interface Rebuilt {
  readonly isCommitted: boolean;
  readonly version: number;
  readonly made: MadeTable;
  readonly baseBytes: number;
  readonly tableBytes: number;
}

/** Makes `counts` the base of the model in the place of the base and all the segments of `from`; what lands meanwhile stays.
 *  Objects first, then the manifest, by one compare-and-set: readers see the old state or the new one. Not committed when
 *  another process replaced the base first. Throws TallypostError when the counts break their identities. */
export async function rebuild(
  world: World,
  desk: Desk,
  schema: Schema,
  from: Manifest,
  counts: EncodedCounts,
  options: RebuildOptions,
): Promise<Rebuilt> {
  const { id } = options;
  checkCounts(counts, keys.bases + id);
  const madeTable = await makeTable(world, desk, schema, from, counts, options);
  const [base, served] = [counts.bytes, encodeTable(madeTable.table)];
  const absorbed = new Set([
    ...(await readAbsorbed(world, from.absorbed)),
    ...from.segments.map((s) => s.id),
  ]);
  const made: [string, Uint8Array][] = [
    [keys.bases + id, base],
    [keys.tables + id, served],
    [keys.absorbed + id, encodeAbsorbed(absorbed)],
  ];
  for (const [key, body] of made) await putNew(world, key, body);
  const isPurge = isPurgeDue(from);
  const committed = await commit<boolean>(world, async (manifest) => {
    if (manifest.base === id) return { kind: 'settled', value: true };
    // Below the floor the objects just made may be deleted already: this process slept through the horizon.
    const isOpen = id >= manifest.floor && isUnchanged(from, manifest, options.isExclusive ?? false);
    if (!isOpen) return { kind: 'settled', value: false };
    await archive(world, manifest);
    const floor = isPurge ? id : manifest.floor;
    const next = successor(manifest, world.nowMs(), {
      schema: schema.id,
      base: id,
      table: id,
      absorbed: id,
      segments: manifest.segments.filter((s) => !absorbed.has(s.id)),
      voided: manifest.voided.filter((segment) => segment >= floor),
      floor,
      renames: options.renames,
      shapedAtVersion: manifest.version + 1,
      purgedAtVersion: isPurge ? from.version : manifest.purgedAtVersion,
      // The superseded objects hold features of the erased: nothing before this can come back.
      oldestVersion: isPurge ? manifest.version + 1 : manifest.oldestVersion,
    });
    return { kind: 'write', next, value: true, gone: absorbed };
  });
  const isCommitted = committed.kind === 'known' && committed.value;
  if (committed.kind === 'known' && !isCommitted)
    await discard(
      world,
      made.map(([key]) => key),
    );
  const version = committed.kind === 'known' ? committed.manifest.version : from.version;
  return { isCommitted, version, made: madeTable, baseBytes: base.length, tableBytes: served.length };
}

/** The table that routers load: today's names of queues, one column each. */
export async function makeTable(
  world: World,
  desk: Desk,
  schema: Schema,
  from: Manifest,
  counts: CountsView,
  { renames, fitModel, bursts }: Pick<RebuildOptions, 'renames' | 'fitModel' | 'bursts'>,
): Promise<MadeTable> {
  const capped = withoutExcess(schema, counts, bursts);
  const columns = capped.columns.map(({ queue, epoch }) => ({ queue: currentName(renames, queue), epoch }));
  const byQueue: CountsView = { ...capped, columns };
  const { halfLifeDays } = desk;
  const last = renamedFit(await lastFit(world, schema, from), renames);
  if (fitModel === null)
    return { table: serve(byQueue, last, { halfLifeDays, bursts }), byQueue, contradictions: [] };
  const drawn = await sampleHistories(world, schema, from, renames);
  const sample = bursts.members.size === 0 ? drawn : drawn.filter(isCounted(bursts, renames));
  const fitted = fitModel(byQueue, sample, last, { halfLifeDays });
  const { fit, contradictions } = 'fit' in fitted ? fitted : { fit: fitted, contradictions: [] };
  return {
    table: serve(byQueue, fit, { halfLifeDays, bursts }),
    byQueue,
    contradictions: contradictions.map(({ index, ...rest }) => {
      const { message, queue } = sample[index];
      return { message, queue, ...rest };
    }),
  };
}

/** The counts without the bursts' excess. It was put in and can be taken out, cell by cell; what a base from elsewhere does not
 *  hold (a recount, say) is refused as `counts-negative`. */
function withoutExcess(schema: Schema, counts: CountsView, { excess }: Bursts): CountsView {
  if (excess.columns.length === 0) return counts;
  return sumCounts(
    schema,
    [
      { counts, sign: 1 },
      { counts: excess, sign: -1 },
    ],
    'counts without the excess of bursts',
  );
}

/** Whether a message of the sample stands in the counts without the excess. */
function isCounted({ members }: Bursts, renames: Renames): (message: SampledMessage) => boolean {
  const named = new Set(
    [...members.keys()].map((key) => {
      const [, held, queue, epoch] = /^(\S+) (.*)@(\d+)$/.exec(key) as RegExpExecArray;
      return `${held} ${currentName(renames, queue)}@${epoch}`;
    }),
  );
  return ({ features, queue, epoch }) => !named.has(memberKey(features, { queue, epoch }));
}

async function lastFit(world: World, schema: Schema, from: Manifest): Promise<Fit> {
  if (from.schema !== schema.id) return defaultFit(schema);
  return (await readTable(world, schema, from.table)).fit;
}

/** What was fitted for single queues follows their names. */
function renamedFit(fit: Fit, renames: Renames): Fit {
  const renamed = (byQueue: Readonly<Record<string, number>>): Record<string, number> => {
    const kept = Object.entries(byQueue).filter(([queue]) => currentName(renames, queue) === queue);
    const moved = Object.entries(byQueue).map(([queue, x]): [string, number] => [
      currentName(renames, queue),
      x,
    ]);
    return Object.fromEntries([...moved, ...kept]);
  };
  const blocks = fit.blocks.map((block) => ({ ...block, byQueue: renamed(block.byQueue) }));
  return { ...fit, blocks, bias: renamed(fit.bias) };
}

/** What was read is still what stands, with nothing but further segments beside it. */
function isUnchanged(from: Manifest, now: Manifest, isExclusive: boolean): boolean {
  if (isExclusive && now.version !== from.version) return false;
  return (
    now.base === from.base &&
    now.restores.length === from.restores.length &&
    JSON.stringify(now.renames) === JSON.stringify(from.renames) &&
    from.segments.every(({ id }) => isNamed(now, id))
  );
}

/** The name of a new base. It sorts after everything that the base replaces, and after whatever another process names from a
 *  manifest read before this one changed: as a floor it leaves nothing that may hold what was erased until now. */
export function newBaseId(world: World, from: Manifest): string {
  return newId(world, latestName(from), from.atMs + 1);
}

function latestName({ floor, base, table, absorbed, segments }: Manifest): string {
  return [floor, base ?? '', table ?? '', absorbed ?? '', ...segments.map((s) => s.id)].reduce(laterOf);
}

/** Keeps the manifest that is about to be replaced: together with the landing versions of its segments it tells every version
 *  since the one before it. */
export async function archive(world: World, manifest: Manifest): Promise<void> {
  if (manifest.version === 0) return;
  const version = String(manifest.version).padStart(12, '0');
  await putNew(
    world,
    `${keys.versions}${version}-${newId(world, '', manifest.atMs)}`,
    encodeManifest(manifest),
  );
}

/** Objects that nothing ever named. What a failing store leaves behind goes after the horizon. */
async function discard(world: World, names: readonly string[]): Promise<void> {
  try {
    for (const key of names) await world.store.delete(key);
  } catch (error) {
    if (!isOfStore(error)) throw error;
  }
}
