import type { HoldReason } from '../decision/decision.ts';
import { historyKey } from '../ledger/history-store.ts';
import { mapBounded } from '../ledger/pace.ts';
import type { World } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import type { ObjectHead } from '../store/store.ts';
import { messageMark, settledOnTheWay } from './pending.ts';

/** A message that a person must look at: held, or routed and drawn at random for a look. */
export interface Waiting {
  readonly message: string;
  readonly atMs: number;
  readonly why: HoldReason | 'look';
  /** Likeliest queue at routing time, or where it went; null when nothing was known. */
  readonly queue: string | null;
  readonly posterior: number;
  /** Of the message as it came. */
  readonly bytes: number;
}

export interface WaitingList {
  /** Oldest first. */
  list(): Promise<Waiting[]>;
  /** How many the last list left out, some of which may be settled; without it: none. */
  beyond?(): number;
}

/** The messages that wait, read from the store. What carries a decision does not change any more, and what is confirmed stays
 *  confirmed, so that each message is looked at once: later calls list and read only what is new. */
export function createWaitingList(world: World): WaitingList {
  const { store } = world;
  /** Key to version, with what it is; null: nobody need look. */
  const known = new Map<string, { readonly version: string; waiting: Waiting | null }>();

  return {
    async list() {
      const fresh: { key: string; version: string }[] = [];
      const present = new Set<string>();
      for await (const { key, etag, modifiedAtMs } of store.list(keys.inbound)) {
        const version = `${etag} ${modifiedAtMs}`;
        present.add(key);
        if (known.get(key)?.version !== version) fresh.push({ key, version });
      }
      for (const key of known.keys()) if (!present.has(key)) known.delete(key);
      await mapBounded(fresh, async ({ key, version }) => {
        const head = await store.head(key);
        // Without a decision it is not waiting yet, and is looked at again.
        if (head?.metadata['tallypost-decision'] === undefined) return;
        known.set(key, { version, waiting: waitingOf(head) });
      });
      const onTheWay = await settledOnTheWay(store);
      const waiting = [...known.values()].filter((each) => each.waiting !== null);
      await mapBounded(waiting, async (each) => {
        const message = (each.waiting as Waiting).message;
        if ((await store.head(historyKey(message))) !== null) each.waiting = null;
      });
      return waiting
        .flatMap((each) => each.waiting ?? [])
        .filter(({ message }) => !onTheWay.has(messageMark(message)))
        .sort((a, b) => a.atMs - b.atMs || (a.message < b.message ? -1 : 1));
    },
  };
}

/** What the head of a message says: whether a person must look at it, and why. */
export function waitingOf({ key, metadata, modifiedAtMs, bytes }: ObjectHead): Waiting | null {
  const isHeld = metadata['tallypost-decision'] === 'held';
  if (!isHeld && metadata['tallypost-audit'] !== 'yes') return null;
  const atMs = Date.parse(metadata['tallypost-at'] ?? '');
  return {
    message: key.slice(keys.inbound.length),
    atMs: Number.isFinite(atMs) ? atMs : modifiedAtMs,
    why: isHeld ? ((metadata['tallypost-reason'] ?? 'unsure') as HoldReason) : 'look',
    queue: metadata['tallypost-queue'] ?? null,
    posterior: Number(metadata['tallypost-posterior'] ?? 0),
    bytes,
  };
}
