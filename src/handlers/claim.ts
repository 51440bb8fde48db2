import { TallypostError } from '../errors.ts';
import type { Extractor } from '../features/extractor.ts';
import type { Features, Schema } from '../features/schema.ts';
import { isTombstone } from '../ledger/history.ts';
import { historyKey, readHistory } from '../ledger/history-store.ts';
import type { Claim, Confirmation, World } from '../ledger/world.ts';
import { decodeFeatures } from '../model/codec-entries.ts';
import { keys } from '../store/keys.ts';
import { readMessage } from './read-message.ts';
import { saidIn, traceIn } from './routing-metadata.ts';

/** A confirmation with what is to be counted under it. */
export interface ReadClaim {
  readonly claim: Claim;
  /** Of the message's routing; empty when it has none. */
  readonly trace: string;
}

/** Features of a message read from its raw form; null when that is gone. */
export async function readFeatures(
  world: World,
  extractor: Extractor,
  message: string,
): Promise<Features | null> {
  const found = await readMessage(world, keys.inbound + message, () => true);
  return found?.message ? extractor.extract(found.message) : null;
}

/** Joins a confirmation with its message's features and with what the router said of it. A message whose raw mail is gone
 *  has the features that its history keeps. Throws TallypostError `message-missing`; the store's failures. */
export async function claimOf(
  world: World,
  extractor: Extractor,
  confirmation: Confirmation,
): Promise<ReadClaim> {
  const key = keys.inbound + confirmation.message;
  const found = await readMessage(world, key, () => true);
  if (found?.message) {
    const { metadata } = found.head;
    const features = extractor.extract(found.message);
    return { claim: { confirmation, features, said: saidIn(metadata) }, trace: traceIn(metadata) };
  }
  const features = await featuresKept(world, extractor.schema, confirmation.message);
  if (features !== null) return { claim: { confirmation, features, said: null }, trace: '' };
  throw new TallypostError({
    code: 'message-missing',
    place: key,
    expected: 'the confirmed message',
    got: 'nothing',
  });
}

/** Null when the message was never confirmed under this schema, or was erased. */
async function featuresKept(world: World, schema: Schema, message: string): Promise<Features | null> {
  const { stored } = await readHistory(world, message);
  if (stored === null || isTombstone(stored)) return null;
  const encoded = stored.features[schema.id];
  return encoded === undefined ? null : decodeFeatures(encoded, schema, historyKey(message));
}
