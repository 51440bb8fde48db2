import { type ChildProcess, fork } from 'node:child_process';
import { readDesk } from '../../../src/desk/read-desk.ts';
import { schemaOf } from '../../../src/features/schema-of.ts';
import { createDeskLoader } from '../../../src/handlers/load-desk.ts';
import { runWaiting } from '../../../src/handlers/local-runner.ts';
import { isDecided } from '../../../src/handlers/routing-metadata.ts';
import { readManifest } from '../../../src/ledger/commit.ts';
import { readCounts } from '../../../src/ledger/objects.ts';
import { recount } from '../../../src/ledger/recount.ts';
import { keys } from '../../../src/store/keys.ts';
import type { Store } from '../../../src/store/store.ts';
import { openPlace, type Place } from '../../race/place.ts';
import { deskJson } from '../../scenario/desk.ts';
import { type Filled, fill } from './fill.ts';
import type { Answer, Order } from './worker.ts';
import { tokenKey, worldOf } from './world.ts';

export interface LoadOptions {
  readonly worker: string;
  readonly place: Place;
  readonly messages: number;
  readonly processes: number;
  readonly seed: number;
}

export interface LoadReport {
  readonly messages: number;
  readonly confirmationDrops: number;
  readonly batches: number;
  readonly kills: number;
  readonly redelivered: number;
  readonly compactions: number;
  readonly seconds: number;
  readonly workPerSecond: number;
  readonly peakMb: number;
  readonly events: Readonly<Record<string, number>>;
  /** Each of these must be empty or zero. */
  readonly wrong: {
    readonly undecided: number;
    readonly decidedTwice: number;
    readonly dropsLeft: number;
    readonly refused: number;
    readonly recountDifferences: number;
    readonly misplacedQueues: readonly string[];
  };
}

/** Fills a store, lets several processes work it off at the same time while one is killed, and judges what came of it. */
export async function runLoad(options: LoadOptions): Promise<LoadReport> {
  const store = await openPlace(options.place);
  const filled = await fill(store, options.messages, options.seed);
  const startedMs = performance.now();
  const worked = await workOff(options, filled.orders);
  // What a killed process left half done is finished as `tallypost run` would.
  const world = worldOf(store);
  const deps = { world, loadDesk: createDeskLoader(world), tokenKey, log: () => {} };
  await runWaiting(deps, { segmentsMax: 1 });
  const seconds = (performance.now() - startedMs) / 1000;
  return {
    messages: options.messages,
    confirmationDrops: filled.drops,
    ...worked.told,
    seconds,
    workPerSecond: (options.messages + filled.drops) / seconds,
    wrong: { ...(await judge(store, filled)), decidedTwice: worked.decidedTwice },
  };
}

interface Worked {
  readonly told: Pick<LoadReport, 'batches' | 'kills' | 'redelivered' | 'compactions' | 'peakMb' | 'events'>;
  readonly decidedTwice: number;
}

function workOff({ worker, place, processes }: LoadOptions, orders: readonly Order[]): Promise<Worked> {
  const waiting = [...orders];
  const compactEvery = Math.max(20, Math.ceil(orders.length / 4));
  const killAt = Math.ceil(orders.length / 3);
  const busy = new Map<ChildProcess, Order>();
  const all = new Set<ChildProcess>();
  const decided = new Map<string, number>();
  const events: Record<string, number> = {};
  let [batches, kills, redelivered, compactions, peakMb, hidden] = [0, 0, 0, 0, 0, 0];
  let isOver = false;
  return new Promise((resolve, reject) => {
    const end = (settle: () => void) => {
      isOver = true;
      for (const child of all) child.kill();
      settle();
    };
    /** Delivered again after a while, as by a queue. */
    const giveBack = (order: Order) => {
      if (order.keys.length === 0) return;
      redelivered += order.keys.length;
      hidden += 1;
      setTimeout(() => {
        hidden -= 1;
        waiting.push(order);
      }, 500);
    };
    const handOut = (child: ChildProcess) => {
      if (isOver) return;
      const order = waiting.shift();
      if (order !== undefined) {
        busy.set(child, order);
        child.send(order);
        // In the middle of its batch.
        if (batches >= killAt && kills === 0) {
          kills += 1;
          setTimeout(() => child.kill('SIGKILL'), 30);
        }
      } else if (busy.size === 0 && hidden === 0) {
        const decidedTwice = [...decided.values()].filter((times) => times > 1).length;
        const told = { batches, kills, redelivered, compactions, peakMb, events };
        end(() => resolve({ told, decidedTwice }));
      } else setTimeout(() => all.has(child) && !busy.has(child) && handOut(child), 50);
    };
    const take = (child: ChildProcess, answer: Answer) => {
      const order = busy.get(child) as Order;
      busy.delete(child);
      if (order.kind === 'compact') compactions += 1;
      else batches += 1;
      peakMb = Math.max(peakMb, answer.peakMb);
      for (const message of answer.decided) decided.set(message, (decided.get(message) ?? 0) + 1);
      for (const [event, times] of Object.entries(answer.events))
        events[event] = (events[event] ?? 0) + times;
      if (answer.failed.length > 0) giveBack({ kind: order.kind, keys: answer.failed });
      if (order.kind !== 'compact' && batches % compactEvery === 0)
        waiting.unshift({ kind: 'compact', keys: [] });
      handOut(child);
    };
    const start = () => {
      const child = fork(worker, [JSON.stringify(place)], {
        execArgv: [],
        stdio: ['ignore', 'ignore', 'inherit', 'ipc'],
      });
      all.add(child);
      child.on('message', (answer: Answer | 'ready') =>
        answer === 'ready' ? handOut(child) : take(child, answer),
      );
      child.on('exit', (code, signal) => {
        all.delete(child);
        const order = busy.get(child);
        busy.delete(child);
        if (isOver) return;
        if (order !== undefined) giveBack(order);
        if (signal === 'SIGKILL') start();
        else end(() => reject(new Error(`a process ended by itself with ${code ?? signal}`)));
      });
    };
    for (let i = 0; i < processes; i++) start();
  });
}

async function judge(store: Store, filled: Filled): Promise<Omit<LoadReport['wrong'], 'decidedTwice'>> {
  const world = worldOf(store);
  const desk = readDesk(deskJson(), keys.desk);
  const schema = schemaOf(desk, tokenKey);
  let undecided = 0;
  for (let at = 0; at < filled.messages.length; at += 16) {
    const heads = await Promise.all(filled.messages.slice(at, at + 16).map((key) => store.head(key)));
    undecided += heads.filter((head) => head === null || !isDecided(head.metadata)).length;
  }
  const countKeys = async (prefix: string) => {
    let found = 0;
    for await (const _ of store.list(prefix)) found += 1;
    return found;
  };
  const { differences, fault } = await recount(world, desk, schema);
  if (fault !== null) throw new Error(`the table cannot be read: ${fault.code} at ${fault.place}`);
  const counts = await readCounts(world, schema, (await readManifest(world)).manifest);
  const found: Record<string, number> = {};
  counts.columns.forEach(({ queue }, c) => {
    found[queue] = (found[queue] ?? 0) + counts.messages[c];
  });
  const queues = new Set([...Object.keys(found), ...Object.keys(filled.standing)]);
  return {
    undecided,
    dropsLeft: await countKeys(keys.confirmations),
    refused: await countKeys(keys.refusedConfirmations),
    recountDifferences: differences.length,
    misplacedQueues: [...queues].filter((queue) => (found[queue] ?? 0) !== (filled.standing[queue] ?? 0)),
  };
}
