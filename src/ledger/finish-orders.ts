import type { Schema } from '../features/schema.ts';
import { keys } from '../store/keys.ts';
import { carryOutErasure } from './erase.ts';
import { isId, timeOf } from './ids.ts';
import { closeOrder, type Order, readOrder } from './orders.ts';
import { sweepHistories } from './sweep.ts';
import { carryOutUndo } from './undo.ts';
import type { World } from './world.ts';

/** Carries out the orders that are older than `ageMs`: younger ones are being carried out by who placed them. Gives how many
 *  are done with, and how many are left for the next time. */
export async function finishOrders(
  world: World,
  schema: Schema,
  ageMs: number,
): Promise<{ readonly finished: number; readonly left: number }> {
  const found: string[] = [];
  for await (const { key, bytes } of world.store.list(keys.orders)) {
    if (bytes === 0) continue;
    const id = key.slice(keys.orders.length, -'.json'.length);
    if (!isId(id) || world.nowMs() - timeOf(id) >= ageMs) found.push(key);
  }
  let [finished, left] = [0, 0];
  for (const key of found) {
    const got = await world.store.get(key);
    // Another process brought it to its end.
    if (got.kind !== 'found' || got.object.bytes === 0) continue;
    if (await carryOut(world, schema, readOrder(got.object.body, key))) {
      await closeOrder(world, key);
      finished += 1;
    } else left += 1;
  }
  return { finished, left };
}

/** True when all of it is done. */
async function carryOut(world: World, schema: Schema, order: Order): Promise<boolean> {
  if (order.kind === 'erase')
    return (await carryOutErasure(world, schema, order.messages, order.atMs)).isDone;
  if (order.kind === 'undo') return (await carryOutUndo(world, schema, order, order.atMs)).isDone;
  return sweepHistories(world);
}
