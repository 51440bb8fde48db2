import { createHash } from 'node:crypto';
import { TallypostError } from '../errors.ts';
import type { Confirmation } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import type { Store } from '../store/store.ts';

/** What each person settled last and may still take back. It becomes a drop like any other, the same that a helpdesk makes,
 *  with the person's next one, when they are done, or after a while. One small object a person, changed only by
 *  compare-and-set:
 *
 *      none ──hold──▶ held ──drop──▶ dropping ──(drop written)──▶ none
 *                      └──take back──▶ none
 *
 *  So of "take back" and "drop" exactly one wins, whatever crashes; what was left `dropping` is dropped again, which changes
 *  nothing: the same confirmation counts once. */
interface Stored {
  readonly state: 'none' | 'held' | 'dropping';
  readonly confirmation: Confirmation | null;
  /** Grows with each write, so that no two states have equal bytes. */
  readonly rev: number;
}

interface Read {
  readonly stored: Stored;
  readonly etag: string | null;
}

const prefix = `${keys.settling}last/`;
const attemptsMax = 6;

/** Called with the key of each drop as soon as it lies in the store. */
export type OnDropped = (key: string) => Promise<void>;

/** The settlement that this person can still take back; null when there is none. */
export async function heldOf(store: Store, by: string): Promise<Confirmation | null> {
  const { stored } = await read(store, keyOf(by));
  return stored.state === 'held' ? stored.confirmation : null;
}

/** Settles a message: whatever the person settled before is dropped for good. Throws TallypostError `store-busy`. */
export async function holdSettlement(
  store: Store,
  confirmation: Confirmation,
  onDropped: OnDropped,
): Promise<void> {
  const key = keyOf(confirmation.by);
  for (let attempt = 0; attempt < attemptsMax; attempt += 1) {
    await dropHeld(store, key, onDropped);
    const now = await read(store, key);
    if (now.stored.state !== 'none') continue;
    if (await write(store, key, now, { state: 'held', confirmation })) return;
  }
  throw busy(key);
}

/** Takes the last settlement back; null when there is none any more. */
export async function takeBack(store: Store, by: string): Promise<Confirmation | null> {
  const key = keyOf(by);
  const now = await read(store, key);
  if (now.stored.state !== 'held') return null;
  return (await write(store, key, now, { state: 'none', confirmation: null }))
    ? now.stored.confirmation
    : null;
}

/** Drops the person's last settlement for good. */
export async function finishSettling(store: Store, by: string, onDropped: OnDropped): Promise<void> {
  await dropHeld(store, keyOf(by), onDropped);
}

/** Drops what everybody left for longer than `ageMs`; 0: everything. */
export async function dropLeft(
  store: Store,
  nowMs: number,
  ageMs: number,
  onDropped: OnDropped,
): Promise<void> {
  for await (const { key } of store.list(prefix)) {
    const { stored } = await read(store, key);
    const at = Date.parse(stored.confirmation?.at ?? '');
    if (stored.state !== 'none' && nowMs - at >= ageMs) await dropHeld(store, key, onDropped);
  }
}

/** Drops that lie in the store and are not folded yet, by the message that they settle. */
export async function settledOnTheWay(store: Store): Promise<Set<string>> {
  const names = new Set<string>();
  for await (const { key } of store.list(dropPrefix))
    names.add(key.slice(dropPrefix.length).split('-')[0] as string);
  return names;
}

/** The part of a drop's name that tells its message. */
export function messageMark(message: string): string {
  return createHash('sha256').update(message).digest('hex').slice(0, 32);
}

const dropPrefix = `${keys.confirmations}page-`;

async function dropHeld(store: Store, key: string, onDropped: OnDropped): Promise<void> {
  const now = await read(store, key);
  const { state, confirmation } = now.stored;
  if (state === 'none' || confirmation === null) return;
  // Lost: another request of the same person took it back or drops it.
  if (state === 'held' && !(await write(store, key, now, { state: 'dropping', confirmation }))) return;
  const time = Date.parse(confirmation.at).toString(36);
  const drop = `${dropPrefix}${messageMark(confirmation.message)}-${time}.json`;
  await store.put(drop, Buffer.from(JSON.stringify(confirmation)), { contentType: 'application/json' });
  const after = await read(store, key);
  const isOurs = after.stored.state === 'dropping' && after.stored.confirmation?.at === confirmation.at;
  if (isOurs) await write(store, key, after, { state: 'none', confirmation: null });
  await onDropped(drop);
}

function keyOf(by: string): string {
  return `${prefix}${createHash('sha256').update(by).digest('hex').slice(0, 32)}.json`;
}

async function read(store: Store, key: string): Promise<Read> {
  const got = await store.get(key, { bytesMax: 64 * 1024 });
  if (got.kind !== 'found') return { stored: { state: 'none', confirmation: null, rev: 0 }, etag: null };
  return {
    stored: JSON.parse(Buffer.from(got.object.body).toString('utf8')) as Stored,
    etag: got.object.etag,
  };
}

async function write(store: Store, key: string, before: Read, next: Omit<Stored, 'rev'>): Promise<boolean> {
  const body = Buffer.from(JSON.stringify({ ...next, rev: before.stored.rev + 1 }));
  const condition = before.etag === null ? { ifNoneMatch: '*' as const } : { ifMatch: before.etag };
  const put = await store.put(key, body, { ...condition, contentType: 'application/json' });
  return put.kind === 'written';
}

function busy(key: string): TallypostError {
  return new TallypostError({
    code: 'store-busy',
    place: key,
    expected: 'one writer at a time',
    got: 'a lost race',
  });
}
