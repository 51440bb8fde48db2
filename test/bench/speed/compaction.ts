import { bounds } from '../../../src/bounds.ts';
import { compact } from '../../../src/ledger/compaction.ts';
import { encodeHistory } from '../../../src/ledger/history.ts';
import { historyKey } from '../../../src/ledger/history-store.ts';
import { firstIdAt } from '../../../src/ledger/ids.ts';
import { emptyManifest, encodeManifest, type Manifest, withSegment } from '../../../src/ledger/manifest.ts';
import { newBaseId, rebuild } from '../../../src/ledger/rebuild.ts';
import { recount } from '../../../src/ledger/recount.ts';
import type { World } from '../../../src/ledger/world.ts';
import { noBursts } from '../../../src/model/bursts.ts';
import { encodeEntries, encodeFeatures } from '../../../src/model/codec-entries.ts';
import { fitTable } from '../../../src/model/fit-table.ts';
import { createTally } from '../../../src/model/tally.ts';
import { createDirectoryStore } from '../../../src/store/directory.ts';
import { keys } from '../../../src/store/keys.ts';
import type { Store } from '../../../src/store/store.ts';
import { createGenerated, entryOf, ordinary, short } from './generated.ts';

/** One process of the measurement: `prepare` makes a store with a base and the last day's segments, `compaction` compacts it,
 *  `recount` counts all histories and compares, so that the peak of memory is that of one of them alone.
 *  Arguments: step, folder of the store, confirmations, queues, `short` or `ordinary` messages. */
const [step, folder, ...numbers] = process.argv.slice(2) as [string, string, ...string[]];
const [count, queues] = numbers.slice(0, 2).map(Number);
const batch = bounds.foldDropsMax;
const weeks = 52;
const kind = numbers[2] === 'ordinary' ? ordinary : short;
const generated = createGenerated({ ...kind, queues, messages: count, weeks });
const inner = createDirectoryStore(folder);
const endMs = generated.message(count).atMs;
/** A day's confirmations wait in segments, the rest is in the base. */
const inBase = count - Math.ceil(count / weeks / 7);
const segments = Array.from(
  { length: Math.ceil(inBase / batch) + Math.ceil((count - inBase) / batch) },
  (_, s) => {
    const isInBase = s < Math.ceil(inBase / batch);
    const from = isInBase ? s * batch : inBase + (s - Math.ceil(inBase / batch)) * batch;
    const to = Math.min(from + batch, isInBase ? inBase : count);
    return {
      id: `${firstIdAt(generated.message(to).atMs)}-${String(s).padStart(12, '0')}`,
      from,
      to,
      isInBase,
    };
  },
);
/** What making messages took, left out of what is measured. */
const making = { ms: 0, cpuMs: 0 };

const steps: Record<string, () => Promise<unknown>> = {
  prepare,
  compaction: () => measure(compactOnce),
  recount: () => measure(recountOnce),
};
process.stdout.write(`${JSON.stringify(await steps[step]())}\n`);

/** Counts everything but the last day from nothing, as a recount does once it has read the histories. */
async function prepare() {
  const world = worldOn(inner);
  const { schema, desk } = generated;
  const absorbed = segments.filter((s) => s.isInBase);
  const from: Manifest = {
    ...emptyManifest,
    version: absorbed.length,
    atMs: endMs,
    schema: schema.id,
    segments: absorbed.map(({ id }, s) => ({ id, version: s + 1 })),
  };
  await inner.put(keys.manifest, encodeManifest(from));
  const counted = await measure(async () => {
    const tally = createTally(schema);
    for (let i = 0; i < inBase; i++) tally.add([timed(() => entryOf(generated, i))]);
    return { counts: tally.sum(null, 'base') };
  });
  const id = newBaseId(world, from);
  const made = await rebuild(world, desk, schema, from, counted.counts, {
    id,
    renames: {},
    bursts: noBursts(schema),
    fitModel: fitTable,
  });
  if (!made.isCommitted) throw new Error('the base was not committed');
  const got = await inner.get(keys.manifest);
  if (got.kind !== 'found') throw new Error('no manifest');
  let manifest = JSON.parse(new TextDecoder().decode(got.object.body)) as Manifest;
  for (const { id, from, to, isInBase } of segments) {
    if (isInBase) continue;
    const entries = Array.from({ length: to - from }, (_, j) => entryOf(generated, from + j));
    await inner.put(keys.segments + id, encodeEntries(schema, entries));
    manifest = withSegment(manifest, endMs, id, schema.id, false);
  }
  await inner.put(keys.manifest, encodeManifest(manifest));
  const { seconds, cpuSeconds, peakMb } = counted;
  return { seconds, cpuSeconds, peakMb };
}

async function compactOnce() {
  const result = await compact(worldOn(withHistories(inner)), generated.desk, generated.schema);
  if (result.kind !== 'compacted' || result.messages !== count)
    throw new Error(`${result.kind}, ${result.messages} messages of ${count}`);
  const { cells, baseBytes, tableBytes, tokens, fit } = result;
  return { cells, baseBytes, tableBytes, tokens, waiting: count - inBase, fitted: fit?.messages ?? 0 };
}

async function recountOnce() {
  const result = await recount(worldOn(withHistories(inner)), generated.desk, generated.schema);
  if (result.messages !== count || result.differences.length > 0 || result.fault !== null)
    throw new Error(`${result.messages} messages, ${result.differences.length} differences`);
  return { messages: result.messages };
}

async function measure<T extends object>(work: () => Promise<T>) {
  const [startedMs, cpu, made] = [performance.now(), process.cpuUsage(), { ...making }];
  const result = await work();
  const used = process.cpuUsage(cpu);
  return {
    ...result,
    confirmations: count,
    seconds: (performance.now() - startedMs - (making.ms - made.ms)) / 1000,
    cpuSeconds: (used.user + used.system) / 1e6 - (making.cpuMs - made.cpuMs) / 1000,
    // maxRSS is in kilobytes, the start of the process included.
    peakMb: process.resourceUsage().maxRSS / 1024,
  };
}

function worldOn(store: Store): World {
  let draws = 0;
  // Names of objects need to differ, no more.
  const random = () => (draws++ * 0.6180339887498949) % 1;
  return { store, nowMs: () => endMs + 1000, random, sleep: async () => {} };
}

function timed<T>(work: () => T): T {
  const [startedMs, cpu] = [performance.now(), process.cpuUsage()];
  const made = work();
  making.ms += performance.now() - startedMs;
  const { user, system } = process.cpuUsage(cpu);
  making.cpuMs += (user + system) / 1000;
  return made;
}

/** The store with a history a message that is made when it is read: a million of them need no room. */
function withHistories(store: Store): Store {
  const { schema, message } = generated;
  const keyAt = (i: number) => historyKey(`m${String(i).padStart(8, '0')}`);
  const segmentOf = (i: number) =>
    i < inBase
      ? segments[Math.floor(i / batch)]
      : segments[Math.ceil(inBase / batch) + Math.floor((i - inBase) / batch)];
  const bytesAt = (i: number): Uint8Array => {
    const { features, queue, atMs } = message(i);
    const at = new Date(atMs).toISOString();
    const confirmation = { queue, by: 'a.tolland', at, segment: segmentOf(i).id };
    return encodeHistory({
      format: 1,
      message: `m${String(i).padStart(8, '0')}`,
      rev: 1,
      features: { [schema.id]: encodeFeatures(features) },
      said: null,
      confirmations: [confirmation],
      placements: [confirmation],
      isErasing: false,
    });
  };
  const headOf = (key: string) => ({ key, etag: '"made"', bytes: 1, modifiedAtMs: endMs });
  return {
    ...store,
    async get(key, options) {
      if (!key.startsWith(keys.histories)) return store.get(key, options);
      const i = Number(/m(\d+)\.json$/.exec(key)?.[1]);
      if (!(i < count)) return { kind: 'missing' };
      const body = timed(() => bytesAt(i));
      const object = { ...headOf(key), bytes: body.length, contentType: '', metadata: {}, body };
      return { kind: 'found', object };
    },
    async *list(prefix, options) {
      if (!prefix.startsWith(keys.histories)) yield* store.list(prefix, options);
      else
        for (let i = 0; i < count; i++) {
          const key = keyAt(i);
          if (key.startsWith(prefix) && key > (options?.after ?? '')) yield headOf(key);
        }
    },
  };
}
