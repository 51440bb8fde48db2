import { bounds } from '../../../src/bounds.ts';
import { compact } from '../../../src/ledger/compaction.ts';
import { encodeHistory } from '../../../src/ledger/history.ts';
import { historyKey } from '../../../src/ledger/history-store.ts';
import { firstIdAt } from '../../../src/ledger/ids.ts';
import { emptyManifest, encodeManifest, type Manifest, withSegment } from '../../../src/ledger/manifest.ts';
import { newBaseId, rebuild } from '../../../src/ledger/rebuild.ts';
import type { World } from '../../../src/ledger/world.ts';
import { encodeEntries, encodeFeatures } from '../../../src/model/codec-entries.ts';
import { sumCounts } from '../../../src/model/sum-counts.ts';
import { createDirectoryStore } from '../../../src/store/directory.ts';
import { keys } from '../../../src/store/keys.ts';
import type { Store } from '../../../src/store/store.ts';
import { createChance } from '../../scenario/random.ts';
import { countsOf, createGenerated, entryOf, type Generated, ordinary } from './generated.ts';

/** One process of the measurement: `prepare` makes a store with a base and the last segments, `compact` compacts it, so that its
 *  peak of memory is that of a compaction alone. */
const [step, folder, count] = [process.argv[2], process.argv[3] as string, Number(process.argv[4])];
const batch = bounds.foldDropsMax;
const weeks = 52;
/** A twentieth waits in segments, the rest is in the base: a busy night. */
const waitingShare = 0.05;
const generated = createGenerated({ ...ordinary, queues: 10, messages: count, weeks });
const chance = createChance(11);
const inner = createDirectoryStore(folder);
const endMs = generated.message(count).atMs;
const segmentIds = Array.from({ length: Math.ceil(count / batch) }, (_, s) => {
  const { atMs } = generated.message(Math.min(count, (s + 1) * batch));
  return `${firstIdAt(atMs)}-${String(s).padStart(12, '0')}`;
});

if (step === 'prepare') await prepare();
else process.stdout.write(`${JSON.stringify(await measure())}\n`);

async function prepare(): Promise<void> {
  const world = worldOn(inner);
  const { schema, desk } = generated;
  const inBase = Math.floor((segmentIds.length * (1 - waitingShare)) as number);
  const from: Manifest = {
    ...emptyManifest,
    version: inBase,
    atMs: endMs,
    schema: schema.id,
    segments: segmentIds.slice(0, inBase).map((id, s) => ({ id, version: s + 1 })),
  };
  await inner.put(keys.manifest, encodeManifest(from));
  const counts = sumCounts(schema, [{ counts: countsOf(generated, inBase * batch), sign: 1 }], 'base');
  const id = newBaseId(world, from);
  const made = await rebuild(world, desk, schema, from, counts, { id, renames: {}, fitModel: null });
  if (!made.isCommitted) throw new Error('the base was not committed');
  const got = await inner.get(keys.manifest);
  if (got.kind !== 'found') throw new Error('no manifest');
  let manifest = JSON.parse(new TextDecoder().decode(got.object.body)) as Manifest;
  for (let s = inBase; s < segmentIds.length; s++) {
    const size = Math.min(batch, count - s * batch);
    const entries = Array.from({ length: size }, (_, j) => entryOf(generated, s * batch + j));
    await inner.put(keys.segments + segmentIds[s], encodeEntries(schema, entries));
    manifest = withSegment(manifest, endMs, segmentIds[s], schema.id, false);
  }
  await inner.put(keys.manifest, encodeManifest(manifest));
}

async function measure() {
  const making = { ms: 0, cpuMs: 0 };
  const world = worldOn(withHistories(inner, generated, making));
  const [startedMs, cpu] = [performance.now(), process.cpuUsage()];
  const result = await compact(world, generated.desk, generated.schema);
  const used = process.cpuUsage(cpu);
  if (result.kind !== 'compacted' || result.messages !== count)
    throw new Error(`${result.kind}, ${result.messages} messages of ${count}`);
  return {
    confirmations: count,
    seconds: (performance.now() - startedMs - making.ms) / 1000,
    cpuSeconds: (used.user + used.system) / 1e6 - making.cpuMs / 1000,
    // maxRSS is in kilobytes, the start of the process included.
    peakMb: process.resourceUsage().maxRSS / 1024,
    cells: result.cells,
    baseBytes: result.baseBytes,
    tableBytes: result.tableBytes,
    fitted: result.fit?.messages ?? 0,
  };
}

function worldOn(store: Store): World {
  return { store, nowMs: () => endMs + 1000, random: () => chance.next(), sleep: async () => {} };
}

/** The store with a history a message that is made when it is read: a million of them need no room. The time that making
 *  takes is left out of what is measured. */
function withHistories(
  store: Store,
  { schema, message }: Generated,
  making: { ms: number; cpuMs: number },
): Store {
  const keyAt = (i: number) => historyKey(`m${String(i).padStart(8, '0')}`);
  const timed = <T>(work: () => T): T => {
    const [startedMs, cpu] = [performance.now(), process.cpuUsage()];
    const made = work();
    making.ms += performance.now() - startedMs;
    const { user, system } = process.cpuUsage(cpu);
    making.cpuMs += (user + system) / 1000;
    return made;
  };
  const bytesAt = (i: number): Uint8Array => {
    const { features, queue, atMs } = message(i);
    const at = new Date(atMs).toISOString();
    const confirmation = { queue, by: 'a.tolland', at, segment: segmentIds[Math.floor(i / batch)] };
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
