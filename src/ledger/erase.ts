import { bounds } from '../bounds.ts';
import type { Fault } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { keys } from '../store/keys.ts';
import { commit, readManifest } from './commit.ts';
import { isTombstone } from './history.ts';
import { readHistory } from './history-store.ts';
import { type Landing, land, type Work } from './land.ts';
import { successor } from './manifest.ts';
import { closeOrder, placeOrder } from './orders.ts';
import { mapBounded } from './pace.ts';
import type { World } from './world.ts';

export interface Erasure {
  readonly message: string;
  readonly kind: 'erased' | 'already' | 'unfinished' | 'dry-run';
  /** Confirmations that stood in its history. */
  readonly confirmations: number;
  readonly fault: Fault | null;
}

export interface EraseResult {
  readonly erasures: readonly Erasure[];
  /** Nothing is left to do but what the traces say. */
  readonly isDone: boolean;
  /** Each kind of stored trace and by when it is gone. */
  readonly traces: readonly Trace[];
}

export interface Trace {
  readonly what: string;
  readonly goneBy: 'now' | 'next compaction' | 'lifecycle';
}

const traces: readonly Trace[] = [
  { what: `raw message (${keys.inbound})`, goneBy: 'now' },
  {
    what: `confirmations waiting or refused (${keys.confirmations}, ${keys.refusedConfirmations})`,
    goneBy: 'now',
  },
  { what: 'features in the sums that routers use', goneBy: 'now' },
  {
    what: `features in its history (${keys.histories}), of which a tombstone without content stays`,
    goneBy: 'now',
  },
  {
    what: `features in segments (${keys.segments}), also in those never committed`,
    goneBy: 'next compaction',
  },
  {
    what: `token hashes in present and superseded tables (${keys.bases}, ${keys.tables})`,
    goneBy: 'next compaction',
  },
  {
    what: 'versions that a bucket keeps of deleted and replaced objects, by its own rules',
    goneBy: 'lifecycle',
  },
];

/** Takes messages out of the counts and out of the store for good. The raw message, the history's content and the contribution
 *  to the sums go at once; segments and tables that held it go with the next compaction. What a crash leaves undone is
 *  finished by the next compaction, from the order written first. */
export async function eraseMessages(
  world: World,
  schema: Schema,
  messages: readonly string[],
  options: { readonly dryRun?: boolean } = {},
): Promise<EraseResult> {
  const distinct = [...new Set(messages)];
  if (options.dryRun)
    return { erasures: await mapBounded(distinct, (m) => preview(world, m)), isDone: true, traces };
  const atMs = world.nowMs();
  const order = await placeOrder(world, { kind: 'erase', messages: distinct, atMs });
  const result = await carryOutErasure(world, schema, distinct, atMs);
  if (result.isDone) await closeOrder(world, order);
  return result;
}

export async function carryOutErasure(
  world: World,
  schema: Schema,
  messages: readonly string[],
  atMs: number,
): Promise<EraseResult> {
  const { version } = (await readManifest(world)).manifest;
  await mapBounded(messages, (message) => world.store.delete(keys.inbound + message));
  const works = messages.map((message): Work => ({ message, requests: [{ kind: 'erase', atMs }] }));
  // Once to take it out of the counts; then, since nothing stands there any more, to leave the tombstone.
  const first = await land(world, schema, works, { patienceMs: 0 });
  const second = await land(world, schema, works, { patienceMs: 0 });
  await deleteDrops(world, new Set(messages));
  const isMarked = await markErased(world, version);
  const erasures = messages.map((message, i) => erasureOf(message, first[i], second[i]));
  return { erasures, isDone: isMarked && erasures.every(({ kind }) => kind !== 'unfinished'), traces };
}

function erasureOf(message: string, first: Landing, second: Landing): Erasure {
  for (const landing of [first, second])
    if (landing.kind === 'unknown')
      return { message, kind: 'unfinished', confirmations: 0, fault: landing.fault };
  const [answer] = first.kind === 'landed' ? first.answers : [];
  if (answer?.kind !== 'done') return { message, kind: 'already', confirmations: 0, fault: null };
  return { message, kind: 'erased', confirmations: answer.confirmations, fault: null };
}

async function preview(world: World, message: string): Promise<Erasure> {
  const { stored } = await readHistory(world, message);
  if (stored !== null && isTombstone(stored))
    return { message, kind: 'already', confirmations: 0, fault: null };
  return { message, kind: 'dry-run', confirmations: stored?.confirmations.length ?? 0, fault: null };
}

/** Lets the next compaction delete older objects, also when the message stood nowhere in the counts any more. */
async function markErased(world: World, since: number): Promise<boolean> {
  const marked = await commit(world, async (manifest) => {
    if (manifest.erasedAtVersion > since) return { kind: 'settled', value: null };
    const next = successor(manifest, world.nowMs(), { erasedAtVersion: manifest.version + 1 });
    return { kind: 'write', next, value: null };
  });
  return marked.kind === 'known';
}

/** Confirmations of erased messages would be refused anyway; they name the message. */
async function deleteDrops(world: World, messages: ReadonlySet<string>): Promise<void> {
  const found: string[] = [];
  for (const prefix of [keys.confirmations, keys.refusedConfirmations])
    for await (const { key, bytes } of world.store.list(prefix))
      if (bytes <= bounds.ledgerJsonBytesMax) found.push(key);
  await mapBounded(found, async (key) => {
    const got = await world.store.get(key);
    if (got.kind === 'found' && messages.has(messageNamedIn(got.object.body)))
      await world.store.delete(key, { ifMatch: got.object.etag });
  });
}

/** A refused drop is kept inside a record of why. */
function messageNamedIn(body: Uint8Array): string {
  try {
    const value = JSON.parse(new TextDecoder().decode(body));
    const message = (value.drop ?? value).message;
    return typeof message === 'string' ? message : '';
  } catch {
    return '';
  }
}
