import { bounds } from '../../bounds.ts';
import type { Desk } from '../../desk/desk.ts';
import { readDesk } from '../../desk/read-desk.ts';

/** A desk of these queues and nothing else: no guards, no declared fields, the costs of a desk that has not said. */
export function deskOfQueues(queues: readonly { readonly id: string; readonly title: string }[]): Desk {
  const file = {
    version: 1,
    name: 'Replay',
    queues: queues.map(({ id, title }) => ({
      id,
      title: title.trim().slice(0, bounds.titleCharsMax) || id,
    })),
    costs: { lookMinutes: 2, wrongRouteMinutes: 15 },
  };
  return readDesk(new TextEncoder().encode(JSON.stringify(file)), 'desk of the replay');
}
