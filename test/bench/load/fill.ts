import { keys } from '../../../src/store/keys.ts';
import type { Store } from '../../../src/store/store.ts';
import { deskJson } from '../../scenario/desk.ts';
import { createChance } from '../../scenario/random.ts';
import { generateScenario } from '../../scenario/scenario.ts';
import type { Order } from './worker.ts';

/** What was put into a store, and what must come of it. */
export interface Filled {
  readonly messages: readonly string[];
  readonly drops: number;
  /** Deliveries in the order of a queue: messages first, their confirmations some time later; every twentieth batch twice. */
  readonly orders: readonly Order[];
  /** Messages that must stand in the counts under each queue: by their newest confirmation. */
  readonly standing: Readonly<Record<string, number>>;
}

const routeBatch = 10;
const confirmBatch = 50;
const repeatedShare = 0.05;
const putsAtOnce = 16;

/** Puts a desk, `count` messages and their confirmations; every twentieth confirmation a second time under another key. */
export async function fill(store: Store, count: number, seed: number): Promise<Filled> {
  const chance = createChance(seed);
  const scenario = generateScenario(seed, { messages: count });
  await store.put(keys.desk, deskJson(scenario));
  const orders: Order[] = [];
  const standing: Record<string, number> = {};
  let routed: string[] = [];
  let confirmed: string[] = [];
  let drops = 0;
  const flush = (kind: 'route' | 'confirm', batch: readonly string[]) => {
    const times = chance.isTrue(repeatedShare) ? 2 : 1;
    for (let i = 0; i < times && batch.length > 0; i++) orders.push({ kind, keys: batch });
  };
  // Several at once: a store over a network takes its time for each.
  let puts: Promise<unknown>[] = [];
  const put = async (...given: Parameters<Store['put']>) => {
    puts.push(store.put(...given));
    if (puts.length < putsAtOnce) return;
    await Promise.all(puts);
    puts = [];
  };
  const drop = async (value: object) => {
    const key = `${keys.confirmations}${String(drops).padStart(6, '0')}.json`;
    drops += 1;
    await put(key, Buffer.from(JSON.stringify(value)));
    confirmed.push(key);
  };
  for (const message of scenario.messages) {
    await put(message.key, message.bytes, { contentType: message.contentType });
    routed.push(message.key);
    if (routed.length >= routeBatch) {
      flush('route', routed);
      routed = [];
    }
    for (const { queue, by, atMs } of message.confirmations) {
      const id = message.key.slice(keys.inbound.length);
      const value = { message: id, queue, by, at: new Date(atMs).toISOString() };
      await drop(value);
      if (chance.isTrue(repeatedShare)) await drop(value);
    }
    const last = message.confirmations.at(-1);
    if (last !== undefined) standing[last.queue] = (standing[last.queue] ?? 0) + 1;
    if (confirmed.length >= confirmBatch) {
      flush('confirm', confirmed);
      confirmed = [];
    }
  }
  await Promise.all(puts);
  flush('route', routed);
  flush('confirm', confirmed);
  return { messages: scenario.messages.map(({ key }) => key), drops, orders, standing };
}
