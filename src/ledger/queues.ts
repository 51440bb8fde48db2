import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import { type Fault, TallypostError } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { keys } from '../store/keys.ts';
import { commit, readManifest } from './commit.ts';
import { checkSchema, type Manifest, type Renames, successor } from './manifest.ts';
import { readCapped, readCounts, withFresh } from './objects.ts';
import { pause } from './pace.ts';
import { currentDesk, currentName } from './queue-names.ts';
import { archive, newBaseId, rebuild } from './rebuild.ts';
import type { World } from './world.ts';

/** What may be done to a queue. Counts keep the names that were confirmed; the manifest says what each is called now. */
export type QueueChange =
  /** The same queue under another id. */
  | { readonly kind: 'rename'; readonly from: string; readonly to: string; readonly title?: string }
  /** Its messages count for `into` from now on; the columns are added exactly. */
  | { readonly kind: 'merge'; readonly from: string; readonly into: string }
  /** No message is routed to it any more; its successor takes its counts over. */
  | { readonly kind: 'retire'; readonly queue: string; readonly successor: string }
  /** A new queue, or one that was merged or retired, with the counts it had. */
  | {
      readonly kind: 'open';
      readonly queue: string;
      readonly title: string;
      readonly wrongRouteMinutes?: number;
    };

export interface QueueResult {
  readonly kind: 'changed' | 'nothing-to-do' | 'lost-race' | 'dry-run';
  /** Of the manifest now. */
  readonly version: number;
  /** Confirmed messages that count for another name from now on. */
  readonly messages: number;
  /** Whether the desk's file was brought in line; what the manifest says holds either way. */
  readonly deskFile: 'updated' | 'unchanged' | 'missing' | 'unfinished';
}

/** Changes a queue for good: the manifest with a table made anew, by one compare-and-set, so that routers see the old queues
 *  with the old counts or the new with the new; then the desk's file, which only repeats it for people. Opening goes the
 *  other way round: first the file, then the manifest. Splitting a queue has no command: open the new one and confirm its
 *  messages again. Throws TallypostError `queue-refused`, and what a compaction throws. */
export async function changeQueue(
  world: World,
  desk: Desk,
  schema: Schema,
  change: QueueChange,
  options: { readonly dryRun?: boolean } = {},
): Promise<QueueResult> {
  return withFresh(async () => {
    const { manifest } = await readManifest(world);
    checkSchema(manifest, schema);
    const id = newBaseId(world, manifest);
    const renames = renamesAfter(desk, manifest.renames, change);
    const messages = await countMoved(world, schema, manifest, renames);
    const isKnown = JSON.stringify(renames) === JSON.stringify(manifest.renames);
    if (options.dryRun)
      return { kind: 'dry-run', version: manifest.version, messages, deskFile: 'unchanged' };
    const opened = change.kind === 'open' ? await editDeskFile(world, change) : null;
    if (opened === 'missing' || opened === 'unfinished')
      return { kind: 'lost-race', version: manifest.version, messages: 0, deskFile: opened };
    const done = isKnown ? null : await commitRenames(world, desk, schema, manifest, { id, renames });
    if (done !== null && !done.isCommitted)
      return { kind: 'lost-race', version: done.version, messages: 0, deskFile: opened ?? 'unchanged' };
    const deskFile = opened ?? (await editDeskFile(world, change));
    const kind = isKnown && deskFile !== 'updated' ? 'nothing-to-do' : 'changed';
    return { kind, version: done?.version ?? manifest.version, messages, deskFile };
  });
}

export function renameQueue(
  world: World,
  desk: Desk,
  schema: Schema,
  change: { readonly from: string; readonly to: string; readonly title?: string },
  options: { readonly dryRun?: boolean } = {},
): Promise<QueueResult> {
  return changeQueue(world, desk, schema, { kind: 'rename', ...change }, options);
}

export function mergeQueues(
  world: World,
  desk: Desk,
  schema: Schema,
  change: { readonly from: string; readonly into: string },
  options: { readonly dryRun?: boolean } = {},
): Promise<QueueResult> {
  return changeQueue(world, desk, schema, { kind: 'merge', ...change }, options);
}

export function retireQueue(
  world: World,
  desk: Desk,
  schema: Schema,
  change: { readonly queue: string; readonly successor: string },
  options: { readonly dryRun?: boolean } = {},
): Promise<QueueResult> {
  return changeQueue(world, desk, schema, { kind: 'retire', ...change }, options);
}

export function openQueue(
  world: World,
  desk: Desk,
  schema: Schema,
  change: { readonly queue: string; readonly title: string; readonly wrongRouteMinutes?: number },
  options: { readonly dryRun?: boolean } = {},
): Promise<QueueResult> {
  return changeQueue(world, desk, schema, { kind: 'open', ...change }, options);
}

/** Renames after the change. Throws TallypostError `queue-refused` with what is wrong. */
export function renamesAfter(desk: Desk, renames: Renames, change: QueueChange): Renames {
  const open = new Set(currentDesk(desk, renames).queues.map((q) => q.id));
  if (change.kind === 'open') {
    if (renames[change.queue]?.kind === 'renamed')
      throw refused(change.queue, 'a name that no queue had', 'a renamed queue');
    checkName(change.queue);
    const { [change.queue]: _, ...rest } = renames;
    return rest;
  }
  const [from, to] =
    change.kind === 'rename'
      ? [change.from, change.to]
      : change.kind === 'merge'
        ? [change.from, change.into]
        : [change.queue, change.successor];
  const kind = ({ rename: 'renamed', merge: 'merged', retire: 'retired' } as const)[change.kind];
  if (renames[from]?.to === to && renames[from]?.kind === kind) return renames;
  if (!open.has(from)) throw refused(from, 'an open queue', 'none of that name');
  if (from === to) throw refused(to, 'another queue', 'the same');
  if (kind !== 'renamed') {
    if (!open.has(to)) throw refused(to, 'an open queue', 'none of that name');
    return { ...renames, [from]: { to, kind } };
  }
  checkName(to);
  // Back to an earlier name of the same queue.
  const isReturn = renames[to]?.kind === 'renamed' && currentName(renames, to) === from;
  if (open.has(to) || (Object.hasOwn(renames, to) && !isReturn))
    throw refused(to, 'a name that no queue had', 'one in use');
  const { [to]: _, ...rest } = renames;
  return { ...rest, [from]: { to, kind } };
}

function checkName(id: string): void {
  if (!/^[a-z0-9][a-z0-9-]{0,62}$/.test(id)) throw refused(id, '1 to 63 of a-z, 0-9 and -', 'something else');
}

function refused(queue: string, expected: string, got: string): TallypostError {
  const fault: Fault = {
    code: 'queue-refused',
    place: `queue ${JSON.stringify(queue.slice(0, 80))}`,
    expected,
    got,
  };
  return new TallypostError(fault);
}

async function countMoved(
  world: World,
  schema: Schema,
  manifest: Manifest,
  renames: Renames,
): Promise<number> {
  const counts = await readCounts(world, schema, manifest);
  return counts.columns.reduce((sum, { queue }, c) => {
    const isMoved = currentName(renames, queue) !== currentName(manifest.renames, queue);
    return sum + (isMoved ? counts.messages[c] : 0);
  }, 0);
}

async function commitRenames(
  world: World,
  desk: Desk,
  schema: Schema,
  manifest: Manifest,
  { id, renames }: { readonly id: string; readonly renames: Renames },
): Promise<{ isCommitted: boolean; version: number }> {
  if (manifest.schema !== '') {
    const { counts, bursts } = await readCapped(world, schema, manifest);
    return rebuild(world, desk, schema, manifest, counts, { id, renames, bursts, fitModel: null });
  }
  const committed = await commit<boolean>(world, async (now) => {
    if (JSON.stringify(now.renames) === JSON.stringify(renames)) return { kind: 'settled', value: true };
    if (now.schema !== '') return { kind: 'settled', value: false };
    await archive(world, now);
    const next = successor(now, world.nowMs(), { renames, shapedAtVersion: now.version + 1 });
    return { kind: 'write', next, value: true };
  });
  if (committed.kind === 'unknown') return { isCommitted: false, version: manifest.version };
  return { isCommitted: committed.value, version: committed.manifest.version };
}

interface DeskFile {
  queues?: { id?: unknown; title?: unknown; wrongRouteMinutes?: unknown }[];
  guards?: { queue?: unknown }[];
}

/** Repeats the change in the desk's file, by compare-and-set, leaving everything else in it as it is. */
async function editDeskFile(world: World, change: QueueChange): Promise<QueueResult['deskFile']> {
  for (let attempt = 0; attempt < bounds.writeAttemptsMax; attempt++) {
    if (attempt > 0) await pause(world, attempt);
    const got = await world.store.get(keys.desk, { bytesMax: bounds.deskBytesMax });
    if (got.kind !== 'found') return 'missing';
    const file = JSON.parse(new TextDecoder().decode(got.object.body)) as DeskFile;
    if (!editDesk(file, change)) return 'unchanged';
    const body = new TextEncoder().encode(`${JSON.stringify(file, null, 2)}\n`);
    const put = await world.store.put(keys.desk, body, {
      ifMatch: got.object.etag,
      contentType: 'application/json',
    });
    if (put.kind === 'written') return 'updated';
  }
  return 'unfinished';
}

/** Gives whether anything changed. */
function editDesk(file: DeskFile, change: QueueChange): boolean {
  const queues = file.queues ?? [];
  if (change.kind === 'open') {
    if (queues.some((q) => q.id === change.queue)) return false;
    const { queue: id, title, wrongRouteMinutes } = change;
    file.queues = [
      ...queues,
      { id, title, ...(wrongRouteMinutes === undefined ? {} : { wrongRouteMinutes }) },
    ];
    return true;
  }
  const from = change.kind === 'retire' ? change.queue : change.from;
  const to = change.kind === 'rename' ? change.to : change.kind === 'merge' ? change.into : change.successor;
  const guards = (file.guards ?? []).filter((g) => g.queue === from);
  for (const guard of guards) guard.queue = to;
  const old = queues.find((q) => q.id === from);
  if (old && change.kind === 'rename') {
    old.id = to;
    if (change.title !== undefined) old.title = change.title;
  } else if (old) file.queues = queues.filter((q) => q !== old);
  return old !== undefined || guards.length > 0;
}
