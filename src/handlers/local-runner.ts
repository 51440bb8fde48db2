import { bounds } from '../bounds.ts';
import { readManifest } from '../ledger/commit.ts';
import { keys } from '../store/keys.ts';
import { type CompactResult, createCompactHandler } from './compact.ts';
import { createConfirmHandler } from './confirm.ts';
import type { HandlerDeps, LogLine } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { createRouteHandler } from './route.ts';
import { isRoutable } from './route-object.ts';
import { isDecided } from './routing-metadata.ts';

/** What one round did. Messages are counted once, by what became of them. */
export interface RunSummary {
  readonly routed: number;
  readonly held: number;
  readonly guarded: number;
  /** Vanished meanwhile, or decided by another process. */
  readonly skipped: number;
  /** Confirmations that are in the counts now, were before, or gave way to newer ones. */
  readonly confirmed: number;
  readonly refused: number;
  /** Messages and confirmations to be tried again. */
  readonly failed: number;
  /** Null when no compaction was due. */
  readonly compaction: CompactResult | null;
}

export interface RunProgress {
  readonly step: 'route' | 'confirm' | 'compact';
  readonly done: number;
  readonly total: number;
}

export interface RunOptions {
  readonly onProgress?: (progress: RunProgress) => void;
  /** Compact when this many segments lie beside the base; Infinity: never. */
  readonly segmentsMax?: number;
}

/** Does all work that waits in a store, once, through the same handlers that run behind the queues. */
export interface LocalRunner {
  run(options?: RunOptions): Promise<RunSummary>;
}

/** A runner that remembers which objects carry a decision, so that a round with nothing new only lists. */
export function createLocalRunner(deps: HandlerDeps): LocalRunner {
  const { store, nowMs, random } = deps.world;
  const tally = new Map<string, number>();
  const counting: HandlerDeps = {
    ...deps,
    log(line: LogLine) {
      tally.set(line.event, (tally.get(line.event) ?? 0) + 1);
      deps.log(line);
    },
  };
  const route = createRouteHandler(counting);
  const confirm = createConfirmHandler(counting);
  const compactNow = createCompactHandler(counting);
  /** Key to version, of objects that carry a decision. */
  const decided = new Map<string, string>();

  async function waitingMessages(): Promise<string[]> {
    const waiting: string[] = [];
    for await (const { key, etag, modifiedAtMs } of store.list(keys.inbound)) {
      // Of equal bytes the ETag may be equal, so that the time counts too.
      const version = `${etag} ${modifiedAtMs}`;
      if (!isRoutable(key) || decided.get(key) === version) continue;
      const head = await store.head(key);
      if (head !== null && isDecided(head.metadata)) decided.set(key, version);
      else if (head !== null) waiting.push(key);
    }
    return waiting;
  }

  async function waitingDrops(): Promise<string[]> {
    const waiting: string[] = [];
    for await (const { key } of store.list(keys.confirmations)) waiting.push(key);
    return waiting;
  }

  /** Feeds keys in batches as the queue would; gives how many are to be tried again. */
  async function feed(
    handler: typeof route,
    waiting: readonly string[],
    batchMax: number,
    onProgress: (done: number) => void,
  ): Promise<number> {
    let failed = 0;
    for (let at = 0; at < waiting.length; at += batchMax) {
      const batch = waiting.slice(at, at + batchMax);
      const { batchItemFailures } = await handler(queueEvent(batch, deps.prefix ?? '', nowMs(), random));
      failed += batchItemFailures.length;
      onProgress(at + batch.length);
    }
    return failed;
  }

  return {
    async run({ onProgress = () => {}, segmentsMax = bounds.localSegmentsMax } = {}) {
      tally.clear();
      const count = (...events: string[]) => events.reduce((sum, event) => sum + (tally.get(event) ?? 0), 0);
      const messages = await waitingMessages();
      const progress = (step: RunProgress['step'], total: number) => (done: number) =>
        onProgress({ step, done, total });
      let failed = await feed(route, messages, bounds.localRouteBatchMax, progress('route', messages.length));
      const drops = await waitingDrops();
      failed += await feed(confirm, drops, bounds.foldDropsMax, progress('confirm', drops.length));
      const { manifest } = await readManifest(deps.world);
      const isDue = manifest.segments.length >= segmentsMax;
      if (isDue) onProgress({ step: 'compact', done: 0, total: 1 });
      const compaction = isDue ? await compactNow({}) : null;
      if (isDue) onProgress({ step: 'compact', done: 1, total: 1 });
      return {
        routed: count('routed'),
        held: count('held'),
        guarded: count('guarded'),
        skipped: count('object-skipped', 'message-missing', 'decided-already'),
        confirmed: count('confirmation-folded', 'confirmation-already', 'confirmation-stale'),
        refused: count('confirmation-refused'),
        failed,
        compaction,
      };
    },
  };
}

/** One round, and no memory of it. */
export function runWaiting(deps: HandlerDeps, options: RunOptions = {}): Promise<RunSummary> {
  return createLocalRunner(deps).run(options);
}

export interface FollowOptions extends RunOptions {
  /** Ends the rounds; the one under way is finished first. */
  readonly signal: AbortSignal;
  readonly intervalMs?: number;
  readonly onRound?: (summary: RunSummary) => void;
}

/** Round after round, with a pause after each, until the signal. A round that fails is logged and followed by the next. */
export async function followWaiting(deps: HandlerDeps, options: FollowOptions): Promise<void> {
  const { signal, intervalMs = bounds.localPauseMs, onRound = () => {} } = options;
  const runner = createLocalRunner(deps);
  while (!signal.aborted) {
    try {
      onRound(await runner.run(options));
    } catch (error) {
      deps.log({ level: 'error', event: 'round-failed', ...faultMembers(error) });
    }
    if (!signal.aborted) await pause(deps, intervalMs, signal);
  }
}

/** Leaves nothing behind on the signal: it outlives as many pauses as there are rounds. */
function pause({ world }: HandlerDeps, ms: number, signal: AbortSignal): Promise<void> {
  return new Promise((resolve, reject) => {
    const end = () => {
      signal.removeEventListener('abort', end);
      resolve();
    };
    signal.addEventListener('abort', end);
    world.sleep(ms).then(end, reject);
  });
}

/** An SQS batch of S3 events, one object a message, with the members that the handlers read.
 *  Source: AWS Lambda Developer Guide, "Using Lambda with Amazon SQS"; Amazon S3 User Guide, "Event message structure". */
export function queueEvent(
  objectKeys: readonly string[],
  prefix: string,
  atMs: number,
  random: () => number,
): { Records: unknown[] } {
  const trace = () =>
    Math.floor(random() * 2 ** 48)
      .toString(16)
      .padStart(12, '0');
  return {
    Records: objectKeys.map((key) => {
      const record = {
        eventVersion: '2.1',
        eventSource: 'aws:s3',
        eventTime: new Date(atMs).toISOString(),
        eventName: 'ObjectCreated:Put',
        responseElements: { 'x-amz-request-id': trace() },
        s3: { object: { key: formEncoded(prefix === '' ? key : `${prefix}/${key}`) } },
      };
      return {
        messageId: trace(),
        eventSource: 'aws:sqs',
        body: JSON.stringify({ Records: [record] }),
      };
    }),
  };
}

function formEncoded(key: string): string {
  return encodeURIComponent(key).replaceAll('%20', '+').replaceAll('%2F', '/');
}
