import { bounds } from '../bounds.ts';
import type { Features, Schema } from '../features/schema.ts';
import { type History, isTombstone, standing } from '../ledger/history.ts';
import { historyKey, readHistory } from '../ledger/history-store.ts';
import type { Renames } from '../ledger/manifest.ts';
import { mapBounded } from '../ledger/pace.ts';
import { currentName } from '../ledger/queue-names.ts';
import type { World } from '../ledger/world.ts';
import { decodeFeatures } from '../model/codec-entries.ts';
import { keys } from '../store/keys.ts';
import type { Seen } from './seen.ts';

export interface SeenInStore extends Seen {
  /** Null when nobody confirmed it, or under another schema. */
  readonly features: Features | null;
  readonly reason: string;
}

/** The newest messages that carry a decision, oldest first, with what people said of them; bounded, whatever the store holds.
 *  One list of all inbound messages, then two small reads for each of the newest. */
export async function readSeen(
  world: World,
  schema: Schema,
  renames: Renames,
): Promise<{ readonly seen: SeenInStore[]; readonly isAll: boolean }> {
  const newest: { key: string; modifiedAtMs: number }[] = [];
  let total = 0;
  const keepNewest = () => {
    newest.sort((a, b) => b.modifiedAtMs - a.modifiedAtMs || (a.key < b.key ? -1 : 1));
    newest.length = Math.min(newest.length, bounds.reportMessagesMax);
  };
  for await (const { key, modifiedAtMs } of world.store.list(keys.inbound)) {
    total += 1;
    newest.push({ key, modifiedAtMs });
    if (newest.length >= 2 * bounds.reportMessagesMax) keepNewest();
  }
  keepNewest();
  const read = await mapBounded(newest, ({ key }) => readOne(world, schema, renames, key));
  const seen = read
    .filter((each) => each !== null)
    .sort((a, b) => a.atMs - b.atMs || (a.message < b.message ? -1 : 1));
  return { seen, isAll: total <= bounds.reportMessagesMax };
}

async function readOne(
  world: World,
  schema: Schema,
  renames: Renames,
  key: string,
): Promise<SeenInStore | null> {
  const head = await world.store.head(key);
  const kind = head?.metadata['tallypost-decision'];
  if (!head || (kind !== 'routed' && kind !== 'held' && kind !== 'guarded')) return null;
  const { metadata } = head;
  const message = key.slice(keys.inbound.length);
  const { stored } = await readHistory(world, message);
  const history = stored === null || isTombstone(stored) ? null : stored;
  const confirmed = history && standing(history.confirmations);
  const queue = metadata['tallypost-queue'];
  const atMs = Date.parse(metadata['tallypost-at'] ?? '');
  return {
    message,
    atMs: Number.isFinite(atMs) ? atMs : head.modifiedAtMs,
    kind,
    queue: queue ? currentName(renames, queue) : null,
    posterior: Number(metadata['tallypost-posterior'] ?? 0),
    reason: metadata['tallypost-reason'] ?? '',
    confirmed: confirmed && {
      queue: currentName(renames, confirmed.queue),
      by: confirmed.by,
      at: confirmed.at,
    },
    isRevised: history !== null && new Set(history.confirmations.map((each) => each.queue)).size > 1,
    features: history && confirmed ? featuresOf(history, schema) : null,
  };
}

function featuresOf(history: History, schema: Schema): Features | null {
  const encoded = history.features[schema.id];
  return encoded === undefined ? null : decodeFeatures(encoded, schema, historyKey(history.message));
}
