import { TallypostError } from '../errors.ts';
import { keys } from '../store/keys.ts';
import { newId } from './ids.ts';
import { putNew } from './objects.ts';
import type { World } from './world.ts';

/** Confirmations of one person or import, by the time they carry. */
export interface UndoScope {
  readonly by: string;
  readonly sinceMs: number;
  /** Not included. */
  readonly untilMs: number;
}

/** What a command was asked to do, written down before it begins and emptied when all of it is done: a process that dies in the
 *  middle leaves its order, and the next compaction brings it to its end. Every step may be repeated. */
export type Order =
  | { readonly kind: 'erase'; readonly messages: readonly string[]; readonly atMs: number }
  | ({ readonly kind: 'undo'; readonly atMs: number } & UndoScope)
  | { readonly kind: 'sweep'; readonly atMs: number };

/** Gives the order's key. */
export async function placeOrder(world: World, order: Order): Promise<string> {
  const key = `${keys.orders}${newId(world, '')}.json`;
  await putNew(world, key, new TextEncoder().encode(`${JSON.stringify(order)}\n`));
  return key;
}

/** All of it is done. The order stays as an empty object, for good: were it deleted, a copy of its writing that was held up on
 *  the way could still arrive, and an undo be carried out again on what was confirmed since. Who did what is not kept. */
export async function closeOrder(world: World, key: string): Promise<void> {
  await world.store.put(key, new Uint8Array(0));
}

/** Throws TallypostError `object-damaged`. */
export function readOrder(bytes: Uint8Array, place: string): Order {
  let value: Partial<Order> & Record<string, unknown> = {};
  try {
    value = JSON.parse(new TextDecoder().decode(bytes));
  } catch {
    // Not JSON: reported below with the rest.
  }
  const isNumber = (v: unknown) => typeof v === 'number';
  const isRight =
    isNumber(value?.atMs) &&
    (value.kind === 'sweep' ||
      (value.kind === 'erase' && Array.isArray(value.messages)) ||
      (value.kind === 'undo' &&
        typeof value.by === 'string' &&
        isNumber(value.sinceMs) &&
        isNumber(value.untilMs)));
  if (!isRight)
    throw new TallypostError({
      code: 'object-damaged',
      place,
      expected: 'an order as this version writes it',
      got: `${bytes.length} other bytes`,
    });
  return value as Order;
}
