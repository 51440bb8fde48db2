import { performance } from 'node:perf_hooks';
import { createMemoryStore } from '../../src/store/memory.ts';
import { exampleDesk } from '../features/example.ts';
import { openStation, type Station, startMs, teach } from '../handlers/station.ts';
import { type HostileInput, html, padding, plea } from './hostile-input.ts';
import { hostileInputs } from './hostile-inputs.ts';

/** One line of the report, written as JSON. */
export interface RouteResult {
  readonly name: string;
  readonly cpuMs: number;
  /** Largest resident size of the process so far, in MB of 2^20 bytes. */
  readonly peakMb: number;
  /** What was written on the object; empty when nothing was. */
  readonly decision: string;
  readonly faults: readonly string[];
}

/** Reasons that words give for holding a message. */
const wordReasons = ['unsure', 'unlike-anything-seen'];

/** A desk whose guard is met by what the attackers pad with, wherever it counts. */
const desk = {
  ...exampleDesk,
  ownAddresses: [...exampleDesk.ownAddresses, 'contact@fenmarkwater.example'],
  guards: [
    { id: 'flood', queue: 'leaks', phrases: ['sewer flooding', 'burst urgent'], senders: [], fields: [] },
  ],
};

/** The next object's body: a stream is read from it as from a store, piece by piece. */
let body: ReturnType<HostileInput['build']> = new Uint8Array();

function createHostileStore(nowMs: () => number) {
  const store = createMemoryStore(nowMs);
  return {
    ...store,
    async stream(key: string) {
      const found = await store.stream(key);
      if (found === null || !key.startsWith('inbound/hostile-')) return found;
      return { head: found.head, chunks: piecesOf(body) };
    },
  };
}

async function* piecesOf(built: typeof body): AsyncGenerator<Uint8Array> {
  if (built instanceof Uint8Array) {
    for (let at = 0; at < built.length; at += 64 * 1024) yield built.subarray(at, at + 64 * 1024);
  } else yield* built;
}

/** Routes a message by the handler, as an event of the store would; what was written on it, and whether it is to be tried
 *  again. */
async function routeOne(
  station: Station,
  name: string,
  channel: HostileInput['channel'],
  built: typeof body,
) {
  body = built;
  const key = `inbound/hostile-${name}${channel === 'form' ? '.json' : ''}`;
  await station.store.put(key, new Uint8Array());
  const { batchItemFailures } = await station.feed(station.route, key);
  const metadata = await station.metadata(key);
  return {
    kind: metadata['tallypost-decision'] ?? '',
    queue: metadata['tallypost-queue'] ?? '',
    reason: metadata['tallypost-reason'] ?? '',
    isToTryAgain: batchItemFailures.length > 0,
  };
}

type Routed = Awaited<ReturnType<typeof routeOne>>;

function faultsOf(input: HostileInput, got: Routed, asPlea: Routed): string[] {
  const said = `${got.kind} ${got.queue} ${got.reason}`.trim();
  if (input.defects.includes('source-failed'))
    return got.isToTryAgain && got.kind === '' ? [] : [`to be tried again, not ${said}`];
  if (got.isToTryAgain) return ['is tried again'];
  if (input.expectedDecision !== 'by-words') {
    const isHeldSo = got.kind === 'held' && got.reason === input.expectedDecision;
    return isHeldSo ? [] : [`${said}, expected held ${input.expectedDecision}`];
  }
  // Only what nobody sees, or somebody else wrote, would meet the guard.
  if (input.drops === 'sewer' && input.keeps === plea) {
    const isAsPlea = got.kind === asPlea.kind && got.queue === asPlea.queue;
    return isAsPlea ? [] : [`${said}, without the padding ${asPlea.kind} ${asPlea.queue}`];
  }
  const isByWords =
    (got.kind === 'routed' && got.queue !== '') ||
    (got.kind === 'held' && wordReasons.includes(got.reason)) ||
    (got.kind === 'guarded' && got.reason === 'flood');
  return isByWords ? [] : [`${said}, expected a decision by words`];
}

/** Learns some mail, then writes a line for each hostile input that goes through the route function. */
async function run(): Promise<void> {
  const station = await openStation(createHostileStore, desk);
  await teach(station);
  for (let i = 0; i < 12; i++) {
    await station.putMail(`meter-${i}`, 'Question', `${plea} Account ${i}.`);
    await station.confirmAs(`meter-${i}`, 'billing');
  }
  // The deadline on parsing needs a clock that goes.
  Object.assign(station.world, { nowMs: () => startMs + 3_600_000 + performance.now() });
  const asPlea = await routeOne(station, 'plea', 'mail', html(`<p>${plea}</p>`));
  const asPadded = await routeOne(station, 'padded', 'mail', html(`<p>${plea}</p><p>${padding}</p>`));
  const inputs = hostileInputs.map((input, i) => ({ input, name: String(i) }));
  say({ name: 'the plea alone', decision: asPlea });
  say({ name: 'the plea with padding that is seen', decision: asPadded });
  for (const { input, name } of inputs) {
    process.stdout.write(`${JSON.stringify({ starting: input.name })}\n`);
    const built = input.build();
    const started = process.cpuUsage();
    const got = await routeOne(station, name, input.channel, built);
    const used = process.cpuUsage(started);
    const faults = faultsOf(input, got, asPlea);
    say({ name: input.name, decision: got, faults, cpuMs: (used.user + used.system) / 1000 });
  }
}

function say(result: {
  readonly name: string;
  readonly decision: Routed;
  readonly faults?: readonly string[];
  readonly cpuMs?: number;
}): void {
  const { kind, queue, reason } = result.decision;
  const line: RouteResult = {
    name: result.name,
    cpuMs: result.cpuMs ?? 0,
    peakMb: process.resourceUsage().maxRSS / 1024,
    decision: [kind, queue, reason].filter((each) => each !== '').join(' '),
    faults: result.faults ?? [],
  };
  process.stdout.write(`${JSON.stringify(line)}\n`);
}

await run();
