import { createCompactHandler } from '../../../src/handlers/compact.ts';
import { createConfirmHandler } from '../../../src/handlers/confirm.ts';
import type { HandlerDeps, LogLine } from '../../../src/handlers/handler-deps.ts';
import { createDeskLoader } from '../../../src/handlers/load-desk.ts';
import { queueEvent } from '../../../src/handlers/local-runner.ts';
import { createRouteHandler } from '../../../src/handlers/route.ts';
import { openPlace, type Place } from '../../race/place.ts';
import { tokenKey, worldOf } from './world.ts';

/** Keys as a queue delivers them; none: a compaction. */
export interface Order {
  readonly kind: 'route' | 'confirm' | 'compact';
  readonly keys: readonly string[];
}

export interface Answer {
  /** Keys to be delivered again. */
  readonly failed: readonly string[];
  /** Messages (without `inbound/`) that this batch wrote a decision on. */
  readonly decided: readonly string[];
  /** Log lines by event. */
  readonly events: Readonly<Record<string, number>>;
  readonly peakMb: number;
}

/** A process that works off batches on orders from its parent until it is killed. */
const world = worldOf(await openPlace(JSON.parse(process.argv[2] as string) as Place));
let lines: LogLine[] = [];
const deps: HandlerDeps = {
  world,
  loadDesk: createDeskLoader(world),
  tokenKey,
  log: (line) => lines.push(line),
};
const handlers = { route: createRouteHandler(deps), confirm: createConfirmHandler(deps) };
const compactNow = createCompactHandler(deps);

async function obey({ kind, keys }: Order): Promise<Answer> {
  lines = [];
  let failed: string[] = [];
  if (kind === 'compact') await compactNow({});
  else {
    const event = queueEvent(keys, '', Date.now(), Math.random);
    const ids = (event.Records as { messageId: string }[]).map((record) => record.messageId);
    const { batchItemFailures } = await handlers[kind](event);
    const failedIds = new Set(batchItemFailures.map((item) => item.itemIdentifier));
    failed = keys.filter((_, i) => failedIds.has(ids[i]));
  }
  const events: Record<string, number> = {};
  for (const { event } of lines) events[event] = (events[event] ?? 0) + 1;
  const decided = lines.flatMap(({ event, message }) =>
    ['routed', 'held', 'guarded'].includes(event) ? [String(message)] : [],
  );
  return { failed, decided, events, peakMb: process.resourceUsage().maxRSS / 1024 };
}

process.on('message', async (order: Order) => {
  try {
    process.send?.(await obey(order));
  } catch (error) {
    process.stderr.write(`${error instanceof Error ? error.stack : error}\n`);
    process.exit(1);
  }
});
process.on('disconnect', () => process.exit(0));
process.send?.('ready');
