import type { Desk, Queue } from '../desk/desk.ts';
import type { Renames } from './manifest.ts';

/** What a queue that was once confirmed is called now. */
export function currentName(renames: Renames, queue: string): string {
  let name = queue;
  // Every change keeps the map free of loops; the count only guards against a damaged one.
  for (let steps = 0; Object.hasOwn(renames, name) && steps < 1000; steps++) name = renames[name].to;
  return name;
}

export function isQueueOpen(desk: Desk, renames: Renames, queue: string): boolean {
  const name = currentName(renames, queue);
  return currentDesk(desk, renames).queues.some((q) => q.id === name);
}

/** The desk with renamed, merged and retired queues replaced, in the lists and in the guards. The desk's file may be older or
 *  newer than the manifest: both give the same. */
export function currentDesk(desk: Desk, renames: Renames): Desk {
  if (Object.keys(renames).length === 0) return desk;
  const ids = new Set(desk.queues.map((q) => q.id));
  const queues: Queue[] = [];
  for (const queue of desk.queues) {
    const id = currentName(renames, queue.id);
    if (id === queue.id) queues.push(queue);
    else if (!ids.has(id)) {
      ids.add(id);
      queues.push({ ...queue, id });
    }
  }
  return {
    ...desk,
    queues,
    guards: desk.guards.map((g) => ({ ...g, queue: currentName(renames, g.queue) })),
  };
}
