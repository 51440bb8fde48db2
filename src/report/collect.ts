import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import { TallypostError } from '../errors.ts';
import { decibansPerNat } from '../explain/balance.ts';
import type { Extractor } from '../features/extractor.ts';
import { tokenHex } from '../features/schema.ts';
import { timeOf } from '../ledger/ids.ts';
import { type LoadedModel, loadModel, renamed } from '../ledger/load-model.ts';
import { mapBounded } from '../ledger/pace.ts';
import { recount } from '../ledger/recount.ts';
import type { World } from '../ledger/world.ts';
import type { Message } from '../message/message.ts';
import { checkCounts } from '../model/check-counts.ts';
import { epochAt } from '../model/fold.ts';
import { recordSaid } from '../model/record.ts';
import { rowOf, type Scorer } from '../model/scorer.ts';
import { keys } from '../store/keys.ts';
import { countCorrections } from './corrections.ts';
import { weighDrift } from './drift.ts';
import { describeWeights } from './health-words.ts';
import { findNewQueues, type HeldMessage } from './new-queue.ts';
import { readPromises } from './promises.ts';
import type { Drift, Health, NewQueue, ReportData } from './report-data.ts';
import { weighRouting } from './routing.ts';
import { contradicted } from './second-look.ts';
import { readSeen, type SeenInStore } from './seen-store.ts';
import { countsOfRow, tokensOfQueue } from './token-counts.ts';
import { countVolume } from './volume.ts';

export interface CollectOptions {
  /** Reads and parses a message by its inbound key; null when it is gone. */
  readonly readMessage: (key: string) => Promise<Message | null>;
  /** Count every history again; left out: when there are few enough of them for a report. */
  readonly isRecounting?: boolean;
}

const dayMs = 24 * 3600 * 1000;
/** What "lately" means: long enough for a small queue to get some mail. */
const recentMs = 14 * dayMs;
const wordRegion = 'word';
const driftDecibansMin = 10;

/** Reads everything the report shows. Changes nothing. Throws what loadModel throws, and the store's failures. */
export async function collectReport(
  world: World,
  fileDesk: Desk,
  extractor: Extractor,
  options: CollectOptions,
): Promise<ReportData> {
  const model = await loadModel(world, fileDesk, extractor.schema, null);
  const { desk, scorer, parts } = model;
  const { seen, isAll } = await readSeen(world, extractor.schema, parts.manifest.renames);
  const wrong = new Map(desk.queues.map((queue) => [queue.id, queue.wrongRouteMinutes]));
  const waiting = seen.filter((each) => each.kind === 'held' && each.confirmed === null);
  const folded = seen.flatMap(({ features, confirmed, message }) =>
    features && confirmed
      ? [{ ...confirmed, message, features, epoch: epochAt(Date.parse(confirmed.at)) }]
      : [],
  );
  const table = parts.table.value;
  return {
    format: 1,
    desk: desk.name,
    madeAt: new Date(world.nowMs()).toISOString(),
    modelVersion: model.version,
    queues: desk.queues.map(({ id, title }) => ({ id, title })),
    costs: desk.costs,
    looked: {
      messages: seen.length,
      isAll,
      from: isoOf(seen[0]),
      to: isoOf(seen.at(-1)),
      confirmed: seen.filter((each) => each.confirmed !== null).length,
    },
    waiting: { messages: waiting.length, oldestAt: isoOf(waiting[0]) },
    promises: readPromises(recordOf(model)),
    routing: weighRouting(seen, {
      lookMinutes: desk.costs.lookMinutes,
      wrongRouteMinutes: (queue) => wrong.get(queue) ?? desk.costs.wrongRouteMinutes,
    }),
    corrections: countCorrections(seen),
    volume: countVolume(seen),
    drift: await collectDrift(options.readMessage, extractor, scorer, seen),
    secondLook: contradicted(scorer, folded.slice(-bounds.secondLookMessagesMax), {
      referenceEpoch: table.referenceEpoch,
      halfLifeDays: table.halfLifeDays,
    }).slice(0, bounds.secondLookListedMax),
    newQueues: await collectNewQueues(options.readMessage, extractor, scorer, waiting),
    health: await collectHealth(world, fileDesk, extractor, model, options.isRecounting ?? isAll),
  };
}

function isoOf(seen: SeenInStore | undefined): string | null {
  return seen === undefined ? null : new Date(seen.atMs).toISOString();
}

/** The table's record with what the segments beside it add. */
function recordOf({ parts }: LoadedModel): Float64Array {
  const record = parts.table.value.counts.record.slice();
  for (const entry of [...parts.segments.values()].flat()) {
    const { said, minus, plus } = renamed(entry, parts.manifest.renames);
    if (said && minus) recordSaid(record, said, minus.queue, -1);
    if (said && plus) recordSaid(record, said, plus.queue, 1);
  }
  return record;
}

/** Words of each queue since two weeks before its newest message, against the table without them. */
async function collectDrift(
  readMessage: CollectOptions['readMessage'],
  extractor: Extractor,
  scorer: Scorer,
  seen: readonly SeenInStore[],
): Promise<Drift[]> {
  const region = extractor.schema.regions.findIndex(({ id }) => id === wordRegion);
  const sinceMs = (seen.at(-1)?.atMs ?? 0) - recentMs;
  const found: Drift[] = [];
  for (const [k, queue] of scorer.queues.entries()) {
    const lately = seen.filter(
      (each) => each.atMs >= sinceMs && each.confirmed?.queue === queue && each.features,
    );
    const recent = new Map<number, number>();
    for (const { features } of lately) {
      for (const token of features?.regions[region] ?? []) recent.set(token, (recent.get(token) ?? 0) + 1);
    }
    const earlierMessages = Math.round((scorer.messages[k] as number) - lately.length);
    if (lately.length < 8 || earlierMessages < 16) continue;
    const earlier = tokensOfQueue(scorer.regions[region]!, k);
    for (const [token, r] of recent) earlier.set(token, Math.max(0, (earlier.get(token) ?? 0) - r));
    const { nats, risen } = weighDrift({ earlierMessages, recentMessages: lately.length, earlier, recent });
    const decibans = nats * decibansPerNat;
    if (decibans < driftDecibansMin) continue;
    found.push({
      queue,
      decibans,
      recentMessages: lately.length,
      earlierMessages,
      since: new Date(sinceMs).toISOString(),
      words: await recoverWords(
        readMessage,
        extractor,
        risen.slice(0, 8),
        lately.map(({ message }) => message),
      ),
    });
  }
  return found.sort((a, b) => b.decibans - a.decibans);
}

async function collectNewQueues(
  readMessage: CollectOptions['readMessage'],
  extractor: Extractor,
  scorer: Scorer,
  waiting: readonly SeenInStore[],
): Promise<NewQueue[]> {
  const region = extractor.schema.regions.findIndex(({ id }) => id === wordRegion);
  const held = await mapBounded(
    waiting.slice(-bounds.groupedMessagesMax),
    async ({ message }): Promise<HeldMessage | null> => {
      const read = await readMessage(keys.inbound + message);
      return read && { message, tokens: Array.from(extractor.extract(read).regions[region] ?? []) };
    },
  );
  const usable = held.filter((each) => each !== null && each.tokens.length > 0) as HeldMessage[];
  const counts = new Map<number, Float64Array>();
  for (const token of new Set(usable.flatMap(({ tokens }) => tokens))) {
    const row = rowOf(scorer.regions[region]!, token);
    if (row < 0) continue;
    counts.set(token, countsOfRow(scorer.regions[region]!, row, scorer.queues.length));
  }
  const groups = findNewQueues(usable, { messages: scorer.messages, counts });
  return Promise.all(
    groups.slice(0, bounds.newQueuesListedMax).map(async ({ messages, nats, tokens }) => ({
      messages,
      decibans: nats * decibansPerNat,
      words: await recoverWords(readMessage, extractor, tokens.slice(0, 10), messages),
    })),
  );
}

/** Words behind tokens, as far as the newest of these messages still exist and hold them. */
async function recoverWords(
  readMessage: CollectOptions['readMessage'],
  extractor: Extractor,
  tokens: readonly number[],
  messages: readonly string[],
): Promise<string[]> {
  const missing = new Set(tokens);
  const words = new Map<number, string>();
  for (const message of messages.slice(-bounds.wordsReadMax).reverse()) {
    if (missing.size === 0) break;
    const read = await readMessage(keys.inbound + message);
    if (read === null) continue;
    const known = extractor.words(read);
    for (const token of [...missing]) {
      const word = known.get(`${wordRegion}:${tokenHex(token)}`);
      if (word === undefined) continue;
      words.set(token, word);
      missing.delete(token);
    }
  }
  return tokens.flatMap((token) => words.get(token) ?? []);
}

async function collectHealth(
  world: World,
  fileDesk: Desk,
  extractor: Extractor,
  model: LoadedModel,
  isRecounting: boolean,
): Promise<Health> {
  const { manifest, table } = model.parts;
  const faults: string[] = model.fault === null ? [] : [`${model.fault.code}: ${model.fault.got}`];
  try {
    checkCounts(table.value.counts, keys.tables + (table.id ?? ''));
  } catch (error) {
    if (!(error instanceof TallypostError)) throw error;
    faults.push(`${error.code} at ${error.place}: expected ${error.expected}, got ${error.got}`);
  }
  const counted =
    isRecounting && model.fault === null ? await recount(world, fileDesk, extractor.schema) : null;
  if (counted && counted.differences.length > 0) faults.push('the recount differs from the table');
  const head = table.id === null ? null : await world.store.head(keys.tables + table.id);
  const { fit, counts } = table.value;
  return {
    faults,
    recount: counted && { messages: counted.messages, differences: counted.differences.length },
    messages: Math.round(model.scorer.messages.reduce((sum, c) => sum + c, 0)),
    cells: counts.regions.reduce((sum, region) => sum + region.column.length, 0),
    tableBytes: head?.bytes ?? 0,
    segments: manifest.segments.length,
    compactedAt: manifest.base === null ? null : new Date(timeOf(manifest.base)).toISOString(),
    fit: { messages: fit.messages, logLoss: fit.logLoss },
    weights: describeWeights(fit),
  };
}
