import desk from '../../events/desk.json' with { type: 'json' };
import type { Scenario } from './scenario.ts';

/** The desk's file of Fenmark Water as bytes; with `atMs`, without the queues that open later than that. */
export function deskJson(scenario?: Scenario, atMs = Number.POSITIVE_INFINITY): Uint8Array {
  const closed = new Set<string>(
    (scenario?.openings ?? []).filter((each) => each.atMs > atMs).map((each) => each.queue),
  );
  const queues = desk.queues.filter((queue) => !closed.has(queue.id));
  return Buffer.from(`${JSON.stringify({ ...desk, queues }, null, 2)}\n`);
}
