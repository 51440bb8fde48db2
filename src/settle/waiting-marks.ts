import { bounds } from '../bounds.ts';
import { historyKey } from '../ledger/history-store.ts';
import { mapBounded } from '../ledger/pace.ts';
import type { World } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import { messageMark, settledOnTheWay } from './pending.ts';
import { type Waiting, type WaitingList, waitingOf } from './waiting.ts';

interface Mark {
  readonly key: string;
  readonly message: string;
  readonly etag: string;
  readonly modifiedAtMs: number;
}

/** Marks a message for the page before its decision is written: a mark too many is taken away by the list, one too few would
 *  hide a message. Its body makes two marks of one message differ. */
export async function markWaiting({ store, nowMs }: World, message: string): Promise<void> {
  await store.put(keys.waiting + message, Buffer.from(new Date(nowMs()).toISOString()), {
    contentType: 'text/plain',
  });
}

/** The messages that wait, from the router's marks: what it costs grows with what waits and not with what came. Reads the
 *  oldest ones only, and takes away marks of messages that are settled or gone. */
export function createMarkedWaitingList({ store }: World): WaitingList {
  let beyond = 0;

  async function read({ key, message, etag }: Mark, onTheWay: ReadonlySet<string>): Promise<Waiting | null> {
    const head = await store.head(keys.inbound + message);
    // The router is about to write its decision.
    if (head !== null && head.metadata['tallypost-decision'] === undefined) return null;
    const waiting = head && waitingOf(head);
    const isSettled = waiting === null || (await store.head(historyKey(message))) !== null;
    if (isSettled) await store.delete(key, { ifMatch: etag });
    return isSettled || onTheWay.has(messageMark(message)) ? null : waiting;
  }

  return {
    async list() {
      const marks: Mark[] = [];
      for await (const { key, etag, modifiedAtMs } of store.list(keys.waiting))
        marks.push({ key, message: key.slice(keys.waiting.length), etag, modifiedAtMs });
      marks.sort((a, b) => a.modifiedAtMs - b.modifiedAtMs || (a.key < b.key ? -1 : 1));
      const onTheWay = await settledOnTheWay(store);
      const found: Waiting[] = [];
      let at = 0;
      while (at < marks.length && at < bounds.settleMarksReadMax && found.length < bounds.settleListedMax) {
        const part = marks.slice(at, at + bounds.settleListedMax);
        const looked = await mapBounded(part, (mark) => read(mark, onTheWay));
        found.push(...looked.filter((each) => each !== null));
        at += part.length;
      }
      beyond = marks.length - at;
      return found.sort((a, b) => a.atMs - b.atMs || (a.message < b.message ? -1 : 1));
    },
    beyond: () => beyond,
  };
}
