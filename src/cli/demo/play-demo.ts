import { createExtractor } from '../../features/extractor.ts';
import { createConfirmHandler } from '../../handlers/confirm.ts';
import type { HandlerDeps, LogLine } from '../../handlers/handler-deps.ts';
import { createDeskLoader } from '../../handlers/load-desk.ts';
import { loadTokenKey } from '../../handlers/load-token-key.ts';
import { queueEvent } from '../../handlers/local-runner.ts';
import { readMessage } from '../../handlers/read-message.ts';
import { createRouteHandler } from '../../handlers/route.ts';
import { type CompactionResult, compact } from '../../ledger/compaction.ts';
import { changeQueue } from '../../ledger/queues.ts';
import type { FitModel } from '../../ledger/rebuild.ts';
import { fitTable } from '../../model/fit-table.ts';
import { writeReport } from '../../report/write-report.ts';
import { keys } from '../../store/keys.ts';
import type { Store } from '../../store/store.ts';
import { createDemoWorld } from './demo-clock.ts';
import type { DemoMessage, DemoScenario } from './demo-scenario.ts';

/** What the router said of one message, beside what was true. */
export interface DemoRow {
  readonly message: DemoMessage;
  readonly kind: 'routed' | 'held' | 'guarded';
  /** Null when nothing was learned yet. */
  readonly queue: string | null;
  readonly posterior: number;
  /** Hold reason or guard id; empty for a routed one. */
  readonly reason: string;
  readonly isAudit: boolean;
}

/** What came of the play. */
export interface DemoPlay {
  readonly rows: readonly DemoRow[];
  readonly days: number;
  /** By log event: what the confirming function did. */
  readonly confirmations: Readonly<Record<string, number>>;
  readonly compactions: number;
  readonly lastCompaction: CompactionResult | null;
  /** Nights in which exponents were fitted. */
  readonly fits: number;
  /** Every history counted again and compared with the table. */
  readonly recount: { readonly messages: number; readonly differences: number };
  /** What is wrong with the table; there should be nothing. */
  readonly faults: readonly string[];
  /** Key of the report's page. */
  readonly report: string;
  /** Warnings and errors that the functions logged; there should be none. */
  readonly troubles: readonly LogLine[];
  readonly version: number;
}

export interface DemoOptions {
  readonly store: Store;
  readonly scenario: DemoScenario;
  /** The desk's file as of a time: without queues that open later. */
  readonly deskJson: (atMs: number) => Uint8Array;
  /** Titles of the queues that open on the way. */
  readonly titleOf: (queue: string) => string;
  readonly seed: number;
  readonly onProgress: (done: number, total: number, what: string) => void;
}

const hourMs = 3_600_000;
const dayMs = 24 * hourMs;
/** What arrived and what was said is worked off at these hours of the day (UTC); the last one is followed by the night's work. */
const roundsAtHours = [12, 24] as const;
/** A new base is made each night of the first week and then each Sunday; in earnest it is each night, but then no 120 nights
 *  pass in a minute. */
const hasCompaction = (day: number) => day < 7 || day % 7 === 6;
/** Exponents move little between two nights: the demo fits them again only when there is this much more to learn from. */
const fitGrowth = 1.5;

/** Plays a scenario on an empty store through the very functions that run in the cloud, fed with the events that they get
 *  there. The same seed plays the same demo. */
export async function playDemo(options: DemoOptions): Promise<DemoPlay> {
  const { store, scenario, deskJson, seed, onProgress } = options;
  const startMs = Math.floor(scenario.messages[0]!.arrivesAtMs / dayMs) * dayMs;
  const { world, setTime } = createDemoWorld(store, seed, startMs);
  await store.put(keys.desk, deskJson(startMs), { contentType: 'application/json' });
  const tokenKey = await loadTokenKey(store, undefined, () => keyFrom(world.random));
  const book = createLogBook(scenario);
  const deps: HandlerDeps = { world, loadDesk: createDeskLoader(world), tokenKey, log: book.log };
  const route = createRouteHandler(deps);
  const confirm = createConfirmHandler(deps);
  const feed = async (handler: typeof route, objects: readonly string[]) => {
    for (let at = 0; at < objects.length; at += 100)
      await handler(queueEvent(objects.slice(at, at + 100), '', world.nowMs(), world.random));
  };

  const arrivals = scenario.messages;
  const drops = arrivals
    .flatMap((message) => message.confirmations.map((confirmation) => ({ message, confirmation })))
    .sort((a, b) => a.confirmation.atMs - b.confirmation.atMs);
  const openings = [...scenario.openings].sort((a, b) => a.atMs - b.atMs);
  const endMs = drops.at(-1)?.confirmation.atMs ?? arrivals.at(-1)!.arrivesAtMs;
  const days = Math.ceil((Math.max(endMs, arrivals.at(-1)!.arrivesAtMs) - startMs + 1) / dayMs);
  let [arrived, dropped, opened, compactions] = [0, 0, 0, 0];
  let lastCompaction: CompactionResult | null = null;
  let [fits, fittedMessages] = [0, 0];
  const fit: FitModel = (counts, sample, previous, settings) => {
    const messages = counts.messages.reduce((sum, c) => sum + c, 0);
    if (messages < fittedMessages * fitGrowth) return previous;
    fits += 1;
    fittedMessages = messages;
    return fitTable(counts, sample, previous, settings);
  };

  for (let day = 0; day < days; day += 1) {
    for (const hours of roundsAtHours) {
      const untilMs = startMs + day * dayMs + hours * hourMs;
      setTime(untilMs);
      while (opened < openings.length && openings[opened]!.atMs < untilMs) {
        const { queue } = openings[opened++]!;
        const desk = await deps.loadDesk();
        const { schema } = createExtractor(desk, tokenKey);
        await changeQueue(world, desk, schema, { kind: 'open', queue, title: options.titleOf(queue) });
      }
      const fresh: string[] = [];
      for (; arrived < arrivals.length && arrivals[arrived]!.arrivesAtMs < untilMs; arrived += 1) {
        const { key, bytes, contentType } = arrivals[arrived]!;
        await store.put(key, bytes, { contentType });
        fresh.push(key);
      }
      await feed(route, fresh);
      const said: string[] = [];
      for (; dropped < drops.length && drops[dropped]!.confirmation.atMs < untilMs; dropped += 1) {
        const key = `${keys.confirmations}${String(dropped).padStart(6, '0')}.json`;
        await store.put(key, dropJson(drops[dropped]!), { contentType: 'application/json' });
        said.push(key);
      }
      await feed(confirm, said);
      onProgress(arrived, arrivals.length, `day ${day + 1} of ${days}, ${arrived} messages`);
    }
    if (!hasCompaction(day) && day < days - 1) continue;
    const tonight = await deps.loadDesk();
    lastCompaction = await compact(world, tonight, createExtractor(tonight, tokenKey).schema, {
      fitModel: fit,
    });
    compactions += 1;
  }
  onProgress(arrived, arrivals.length, 'counting everything again, and writing the report');
  const desk = await deps.loadDesk();
  const { data, page } = await writeReport(world, desk, createExtractor(desk, tokenKey), {
    readMessage: async (key) => (await readMessage(world, key, () => true))?.message ?? null,
    isRecounting: true,
  });
  return {
    rows: book.rows(),
    days,
    confirmations: book.confirmations(),
    compactions,
    lastCompaction,
    fits,
    recount: data.health.recount ?? { messages: 0, differences: 0 },
    faults: data.health.faults,
    report: page,
    troubles: book.troubles(),
    version: data.modelVersion,
  };
}

function keyFrom(random: () => number): Uint8Array {
  return Uint8Array.from({ length: 16 }, () => Math.floor(random() * 256));
}

function dropJson(drop: {
  message: DemoMessage;
  confirmation: DemoMessage['confirmations'][number];
}): Uint8Array {
  const { queue, by, atMs } = drop.confirmation;
  const message = drop.message.key.slice(keys.inbound.length);
  return new TextEncoder().encode(
    `${JSON.stringify({ message, queue, by, at: new Date(atMs).toISOString() })}\n`,
  );
}

/** Reads the functions' own log: what they say they did is what the summary tells. */
function createLogBook(scenario: DemoScenario) {
  const byId = new Map(scenario.messages.map((each) => [each.key.slice(keys.inbound.length), each]));
  const rows: DemoRow[] = [];
  const confirmations: Record<string, number> = {};
  const troubles: LogLine[] = [];
  return {
    log(line: LogLine) {
      const { event, message: id } = line;
      if (line.level !== 'info') troubles.push(line);
      if (event === 'routed' || event === 'held' || event === 'guarded') {
        rows.push({
          message: byId.get(id as string)!,
          kind: event,
          queue: (line.queue as string | null) ?? null,
          posterior: line.posterior as number,
          reason: String(line.reason ?? line.guard ?? ''),
          isAudit: line.isAudit === true,
        });
      } else if (event.startsWith('confirmation-')) {
        const kind = event.slice('confirmation-'.length);
        confirmations[kind] = (confirmations[kind] ?? 0) + 1;
      }
    },
    rows: () => rows,
    confirmations: () => confirmations,
    troubles: () => troubles,
  };
}
