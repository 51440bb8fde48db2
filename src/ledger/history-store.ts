import { bounds } from '../bounds.ts';
import type { Fault } from '../errors.ts';
import { keys } from '../store/keys.ts';
import { decodeHistory, encodeHistory, type Stored } from './history.ts';
import { faultOf, isLasting, isOfStore, pause } from './pace.ts';
import type { World } from './world.ts';

export interface ReadHistory {
  readonly stored: Stored | null;
  readonly etag: string | null;
}

export function historyKey(message: string): string {
  return `${keys.histories}${message}.json`;
}

export function messageOf(historyKeyFound: string): string {
  return historyKeyFound.slice(keys.histories.length, -'.json'.length);
}

export async function readHistory(world: World, message: string): Promise<ReadHistory> {
  const key = historyKey(message);
  const got = await world.store.get(key, { bytesMax: bounds.ledgerJsonBytesMax });
  if (got.kind !== 'found') return { stored: null, etag: null };
  return { stored: decodeHistory(got.object.body, key), etag: got.object.etag };
}

/** Ids of all messages that have a history, in the store's order. */
export async function* listMessages(world: World): AsyncIterable<string> {
  for await (const { key } of world.store.list(keys.histories)) yield messageOf(key);
}

/** What a history should become; null: leave it. `value` is the caller's answer. */
export interface Edit<T> {
  readonly next: Stored | null;
  readonly value: T;
}

export type Edited<T> =
  | { readonly kind: 'known'; readonly value: T }
  /** The change may or may not have happened, or may happen yet. */
  | { readonly kind: 'unknown'; readonly fault: Fault };

/** Changes a history by compare-and-set and returns only what is certain: the write landed, or `edit` saw, in a state that
 *  an earlier attempt of ours can no longer replace, that nothing is to be written. A read alone is not enough for that:
 *  a write whose answer was lost may still be on its way while the ETag it expects stands. */
export async function editHistory<T>(
  world: World,
  message: string,
  first: ReadHistory | null,
  edit: (stored: Stored | null) => Edit<T>,
): Promise<Edited<T>> {
  const key = historyKey(message);
  let fault: Fault = { code: 'contended', place: key, expected: 'a turn to write', got: 'none' };
  let read = first;
  let triedOn: { readonly etag: string | null } | null = null;
  for (let attempt = 0; attempt < bounds.writeAttemptsMax; attempt++) {
    if (attempt > 0) await pause(world, attempt);
    try {
      read ??= await readHistory(world, message);
      const { next, value } = edit(read.stored);
      if (next === null && (triedOn === null || triedOn.etag !== read.etag)) return { kind: 'known', value };
      if (next !== null) {
        const { etag } = read;
        triedOn = { etag };
        const condition = etag === null ? { ifNoneMatch: '*' as const } : { ifMatch: etag };
        const put = await world.store.put(key, encodeHistory(next), condition);
        if (put.kind === 'written') return { kind: 'known', value };
      }
    } catch (error) {
      if (!isOfStore(error) && triedOn === null) throw error;
      fault = faultOf(error, key);
      if (!isOfStore(error) || isLasting(fault)) return { kind: 'unknown', fault };
    }
    read = null;
  }
  return { kind: 'unknown', fault };
}
