import type { ChildProcess } from 'node:child_process';
import { fork } from 'node:child_process';
import { recount } from '../../src/ledger/recount.ts';
import type { World } from '../../src/ledger/world.ts';
import { desk, schema, standings, startMs } from '../ledger/fixture.ts';
import type { Deliveries } from './claims.ts';
import { openPlace, type Place } from './place.ts';
import type { Answer, Order, WireClaim } from './worker.ts';

export interface RaceOptions {
  readonly worker: string;
  readonly place: Place;
  readonly processes: number;
  readonly batch: number;
  readonly killEveryMs: number;
  /** A compaction is ordered after so many batches, besides one that may still run. */
  readonly compactEveryBatches: number;
  readonly deliveries: Deliveries;
}

export interface RaceReport {
  readonly kills: number;
  readonly batches: number;
  /** Deliveries handed out again because their process died or answered `retry`. */
  readonly redelivered: number;
  readonly compactions: number;
  readonly outcomes: Readonly<Record<string, number>>;
  readonly thrown: readonly string[];
}

/** A queue that delivers at least once, worked off by processes of which one is killed every few seconds. */
export async function runRace(options: RaceOptions): Promise<RaceReport> {
  const waiting: WireClaim[] = options.deliveries.claims.map(
    ({ confirmation: { message, queue, by, at } }) => ({
      message,
      queue,
      by,
      minute: (Date.parse(at) - startMs) / 60_000,
    }),
  );
  const busy = new Map<ChildProcess, readonly WireClaim[]>();
  const all = new Set<ChildProcess>();
  const outcomes: Record<string, number> = {};
  const thrown: string[] = [];
  let kills = 0;
  let batches = 0;
  let redelivered = 0;
  let compactions = 0;
  let batchesAtCompaction = 0;
  /** Claims given back that are not to be delivered yet. */
  let hidden = 0;
  let isOver = false;

  return new Promise((resolve, reject) => {
    /** Delivers again after a while, as a queue does once a message's visibility runs out. */
    const giveBack = (claims: readonly WireClaim[]): void => {
      if (claims.length === 0) return;
      redelivered += claims.length;
      hidden += claims.length;
      setTimeout(() => {
        hidden -= claims.length;
        waiting.push(...claims);
      }, 300);
    };

    function handOut(child: ChildProcess): void {
      if (isOver) return;
      let order: Order | null = null;
      const compacting = [...busy.values()].filter((claims) => claims.length === 0).length;
      if (batches - batchesAtCompaction >= options.compactEveryBatches && compacting < 2) {
        batchesAtCompaction = batches;
        order = { kind: 'compact' };
      } else if (waiting.length > 0) order = { kind: 'fold', claims: waiting.splice(0, options.batch) };
      if (order !== null) {
        busy.set(child, order.kind === 'fold' ? order.claims : []);
        child.send(order);
      } else if (busy.size === 0 && hidden === 0) finish();
      // Others may still give claims back: ask again soon.
      else setTimeout(() => all.has(child) && !busy.has(child) && handOut(child), 50);
    }

    function take(child: ChildProcess, answer: Answer | 'ready'): void {
      if (answer === 'ready') {
        handOut(child);
        return;
      }
      const claims = busy.get(child) ?? [];
      busy.delete(child);
      if (answer.kind === 'threw') {
        thrown.push(answer.error);
        giveBack(claims);
      } else if (answer.kind === 'compacted') compactions += answer.outcome === 'compacted' ? 1 : 0;
      else if (answer.kind === 'folded') {
        batches += 1;
        for (const kind of [...answer.outcomes, ...answer.faults]) outcomes[kind] = (outcomes[kind] ?? 0) + 1;
        giveBack(claims.filter((_, i) => answer.outcomes[i] === 'retry'));
      }
      handOut(child);
    }

    function start(): void {
      const child = fork(options.worker, [JSON.stringify(options.place)], {
        execArgv: [],
        env: { ...process.env, NODE_NO_WARNINGS: '1' },
        stdio: ['ignore', 'ignore', 'inherit', 'ipc'],
      });
      all.add(child);
      child.on('message', (answer: Answer | 'ready') => take(child, answer));
      child.on('exit', (code, signal) => {
        all.delete(child);
        giveBack(busy.get(child) ?? []);
        busy.delete(child);
        if (isOver) return;
        if (signal === 'SIGKILL') start();
        else end(() => reject(new Error(`a process ended by itself with ${code ?? signal}`)));
      });
    }

    function end(settle: () => void): void {
      isOver = true;
      clearInterval(killing);
      clearInterval(telling);
      for (const child of all) child.kill('SIGKILL');
      settle();
    }
    const finish = (): void =>
      end(() => resolve({ kills, batches, redelivered, compactions, outcomes, thrown }));

    // Not before some batches are through since the last one: on a slow machine new processes would never get to work.
    let batchesAtKill = 0;
    const killing = setInterval(() => {
      const child = [...busy.keys()][Math.floor(Math.random() * busy.size)];
      if (batches - batchesAtKill < options.processes || !child?.kill('SIGKILL')) return;
      kills += 1;
      batchesAtKill = batches;
    }, options.killEveryMs);
    const telling = setInterval(() => {
      process.stdout.write(
        `  ${waiting.length + hidden} deliveries wait, ${batches} batches, ${kills} kills\n`,
      );
    }, 15_000);
    for (let i = 0; i < options.processes; i++) start();
  });
}

export interface Verdict {
  /** Cells in which the table and the recount of the histories differ. */
  readonly cells: number;
  /** Messages that do not stand exactly once under the queue of their newest confirmation. */
  readonly misplaced: readonly string[];
  readonly counted: number;
}

/** Judges the table twice: against the histories, and against the deliveries themselves. */
export async function judge(place: Place, { messages, expected }: Deliveries): Promise<Verdict> {
  const world: World = {
    store: await openPlace(place),
    nowMs: Date.now,
    random: Math.random,
    sleep: async () => {},
  };
  const { differences, fault, messages: counted } = await recount(world, desk, schema);
  if (fault !== null) throw new Error(`the table cannot be read: ${fault.code} at ${fault.place}`);
  const found = await standings(world, messages);
  return {
    cells: differences.length,
    misplaced: messages.filter((message) => found[message] !== expected[message]),
    counted,
  };
}
