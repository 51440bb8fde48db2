import type { World } from '../../src/ledger/world.ts';
import { desk, seeded, startMs } from '../ledger/fixture.ts';
import { work } from './actors.ts';
import { Checker, fail } from './checker.ts';
import { checkEnd } from './end.ts';
import { Oracle, type Undo } from './oracle.ts';
import { drawPlan, type Job, type Plan } from './plan.ts';
import { type Process, Scheduler } from './scheduler.ts';
import { Objects, storeOf } from './simulated-store.ts';

export interface Summary {
  readonly seed: number;
  /** Calls of the store. */
  readonly steps: number;
  readonly faults: number;
  readonly crashes: number;
  /** Manifests committed, each checked. */
  readonly versions: number;
}

/** One run: processes that share a store, chosen and disturbed by the seed alone. */
export class Simulation {
  readonly seed: number;
  readonly oracle = new Oracle();
  readonly plan: Plan;
  readonly scheduler: Scheduler;
  readonly objects: Objects;
  readonly checker: Checker;
  readonly #random: () => number;
  /** Order to the undo and those that may still be carrying it out. */
  readonly #undoOf = new Map<string, { readonly undo: Undo; busy: Set<symbol> | null }>();
  /** Orders ever placed. */
  readonly #placed = new Set<string>();
  /** Processes that carry out orders. */
  readonly #carriers = new Set<symbol>();

  constructor(seed: number) {
    this.seed = seed;
    this.#random = seeded(seed);
    this.plan = drawPlan(this.#random);
    this.oracle.delivered.push(...this.plan.drops);
    this.scheduler = new Scheduler(this.#random, startMs);
    this.objects = new Objects(() => this.scheduler.nowMs);
    this.checker = new Checker(this.objects, this.oracle, this.plan.messages);
    this.objects.onWrite = (key) => {
      try {
        this.#onWrite(key);
      } catch (error) {
        // Not to the process that wrote: it would take it for a failure of the store.
        this.scheduler.failure ??= error;
      }
    };
    this.objects.onDelete = (key) => this.#onDone(key);
    this.objects.put('config/desk.json', new TextEncoder().encode(JSON.stringify(desk)));
  }

  /** Throws the first thing that must not happen. */
  async run(): Promise<Summary> {
    const { scheduler, plan } = this;
    scheduler.rates = plan.rates;
    const waiting = [...plan.jobs];
    while (waiting.length > 0 || scheduler.running > 0) {
      if (scheduler.failure) throw scheduler.failure;
      const mayStart = waiting.length > 0 && scheduler.running < plan.processesMax;
      if (mayStart && (scheduler.running === 0 || this.#random() < 0.15))
        this.#start(waiting.shift() as Job, waiting);
      if (this.#random() < plan.longPauseRate) scheduler.nowMs += 16 * 24 * 3600_000;
      await scheduler.step();
    }
    scheduler.calm();
    while (await scheduler.step()) if (scheduler.failure) throw scheduler.failure;
    await checkEnd(this);
    if (scheduler.failure) throw scheduler.failure;
    const { steps, faults, crashes } = scheduler;
    return { seed: this.seed, steps, faults, crashes, versions: this.checker.version };
  }

  /** Runs one operation to its end, alone. */
  async perform<T>(name: string, operation: (world: World) => Promise<T>): Promise<T> {
    let value: T | null = null;
    this.#spawn(name, operation, (ended) => {
      value = ended;
    });
    while (this.scheduler.running > 0) {
      await this.scheduler.step();
      if (this.scheduler.failure) throw this.scheduler.failure;
    }
    return value as T;
  }

  #start(job: Job, waiting: Job[]): void {
    this.#spawn(
      job.kind,
      (world) => work(this, world, job),
      () => {
        if (job.kind !== 'fold') return;
        // Not all acknowledged, or delivered once more all the same; at any later time.
        const isDue = job.drops.some((d) => d.acknowledgedAt === null) || this.#random() < 0.1;
        if (isDue && this.#random() < 0.9)
          waiting.splice(Math.floor(this.#random() * (waiting.length + 1)), 0, job);
      },
    );
  }

  #spawn<T>(name: string, operation: (world: World) => Promise<T>, onEnd: (value: T | null) => void): void {
    const skewMs = Math.floor((this.#random() * 2 - 1) * this.plan.skewMsMax);
    const id = Symbol(name);
    if (name === 'undo' || name === 'compact') this.#carriers.add(id);
    this.scheduler.spawn(
      name,
      skewMs,
      (process) => operation(this.#worldOf(process)),
      (value: T | null) => {
        this.#carriers.delete(id);
        for (const order of this.#undoOf.values()) order.busy?.delete(id);
        this.#endUndos();
        onEnd(value);
      },
    );
  }

  #worldOf(process: Process): World {
    const { scheduler } = this;
    return {
      store: storeOf(this.objects, scheduler, process),
      nowMs: () => Math.max(0, scheduler.nowMs + process.skewMs),
      random: this.#random,
      sleep: (ms) => scheduler.sleep(process, ms),
    };
  }

  #onWrite(key: string): void {
    if (key === 'model/manifest.json') this.checker.check();
    if (!key.startsWith('model/orders/')) return;
    const text = new TextDecoder().decode(this.objects.held.get(key)?.body);
    if (text === '') {
      this.#onDone(key);
      return;
    }
    if (this.#placed.has(key)) fail(`${key} stands again after it was carried out`);
    this.#placed.add(key);
    const order = JSON.parse(text);
    for (const message of order.messages ?? []) this.oracle.erasureOrdered.add(message);
    if (order.kind !== 'undo') return;
    const { by, sinceMs, untilMs } = order;
    const undo: Undo = { by, sinceMs, untilMs, startedAt: this.oracle.tick(), endedAt: null };
    this.#undoOf.set(key, { undo, busy: null });
    this.oracle.undos.push(undo);
  }

  #onDone(key: string): void {
    const order = this.#undoOf.get(key);
    if (order) order.busy ??= new Set(this.#carriers);
    this.#endUndos();
  }

  /** An undo has ended when its order is done, and nobody is left who read the order before. */
  #endUndos(): void {
    for (const { undo, busy } of this.#undoOf.values())
      if (busy?.size === 0) undo.endedAt ??= this.oracle.tick();
  }
}
