/** Runs processes one store call at a time. Every call parks its process; the scheduler draws which goes on next, what befalls
 *  the call, and how far the clock moves. All draws come from one seed, so that a run can be repeated exactly. */

export interface FaultRates {
  /** The caller dies, half of the times after the effect. */
  readonly crash: number;
  /** The call throws and nothing happened. */
  readonly failBefore: number;
  /** It happened, and the call throws: the answer is lost. */
  readonly failAfter: number;
  /** The call throws, and it happens later, at any time. */
  readonly late: number;
  /** It happens, and once more later. */
  readonly duplicate: number;
  /** A conditional write is answered as lost: half of the times it landed. */
  readonly spuriouslyLost: number;
  /** Share of lost answers and late effects that come much later. */
  readonly slow: number;
  /** The process is not chosen for the next hundreds of steps. */
  readonly stall: number;
  /** For a while all writes of one object fail, or happen much later. */
  readonly outage: number;
}

export const noFaults: FaultRates = {
  crash: 0,
  failBefore: 0,
  failAfter: 0,
  late: 0,
  duplicate: 0,
  spuriouslyLost: 0,
  slow: 0.5,
  stall: 0,
  outage: 0,
};

export interface Process {
  readonly name: string;
  readonly skewMs: number;
  isAlive: boolean;
  calls: number;
}

export class SimulationError extends Error {
  override readonly name = 'SimulationError';
}

/** Far above what any operation needs, however many others crashed or hold something. */
const callsMax = 20_000;

interface Parked {
  readonly process: Process | null;
  readonly run: () => void;
  /** Not chosen before this step while others can go on. */
  readonly fromStep: number;
}

export class Scheduler {
  readonly random: () => number;
  rates: FaultRates = noFaults;
  nowMs: number;
  /** Told of every call, for looking at one seed. */
  trace: ((line: string) => void) | null = null;
  steps = 0;
  crashes = 0;
  faults = 0;
  /** The first thing that must not happen; ends the run. */
  failure: unknown = null;
  readonly #parked: Parked[] = [];
  #spawned = 0;
  #outage = { label: '', untilStep: 0, lateShare: 0 };
  #running = 0;

  constructor(random: () => number, startMs: number) {
    this.random = random;
    this.nowMs = startMs;
  }

  /** Starts a process; `body` ends with its value, unless it crashes: then `onEnd` gets null. */
  spawn<T>(
    name: string,
    skewMs: number,
    body: (process: Process) => Promise<T>,
    onEnd: (value: T | null) => void,
  ): void {
    this.#spawned += 1;
    const process: Process = { name: `${name} ${this.#spawned}`, skewMs, isAlive: true, calls: 0 };
    this.#running += 1;
    let hasEnded = false;
    const end = (value: T | null) => {
      if (hasEnded) return;
      hasEnded = true;
      this.#running -= 1;
      onEnd(value);
    };
    this.#onCrash.set(process, () => end(null));
    body(process).then(end, (error: unknown) => {
      if (process.isAlive) this.failure ??= error;
      end(null);
    });
  }
  readonly #onCrash = new WeakMap<Process, () => void>();

  get running(): number {
    return this.#running;
  }

  sleep(process: Process, ms: number): Promise<void> {
    const wakeAtMs = this.nowMs + ms;
    return new Promise((resolve) => {
      this.#park(process, () => {
        this.nowMs = Math.max(this.nowMs, wakeAtMs);
        resolve();
      });
    });
  }

  /** One call of the store. `effect` acts at once and gives the answer. `lost`: what a conditional write answers when it is
   *  refused; null for other calls. */
  call<T>(process: Process, label: string, isWrite: boolean, lost: T | null, effect: () => T): Promise<T> {
    process.calls += 1;
    if (process.calls > callsMax) this.failure ??= new SimulationError(`${process.name} does not end`);
    return new Promise((resolve, reject) => {
      this.#park(process, () => {
        const answer = (act: () => T) => {
          try {
            resolve(act());
          } catch (error) {
            reject(error);
          }
        };
        const fate = this.#drawFate(label, isWrite, lost !== null);
        if (fate !== 'fine') this.faults += 1;
        this.trace?.(`${this.nowMs} ${process.name}: ${label}${fate === 'fine' ? '' : ` (${fate})`}`);
        if (fate === 'crash') {
          if (isWrite && this.random() < 0.5) effect();
          this.kill(process);
        } else if (fate === 'failBefore') reject(new Error('connection reset'));
        else if (fate === 'failAfter') {
          effect();
          this.#later(process, () => reject(new Error('timeout')));
        } else if (fate === 'late') {
          this.#later(null, effect);
          reject(new Error('timeout'));
        } else if (fate === 'duplicate') {
          this.#later(null, effect);
          answer(effect);
        } else if (fate === 'spuriouslyLost') {
          if (this.random() < 0.5) effect();
          this.#later(process, () => resolve(lost as T));
        } else answer(effect);
      });
    });
  }

  /** From now on nothing goes wrong any more. */
  calm(): void {
    this.rates = noFaults;
    this.#outage.untilStep = 0;
  }

  kill(process: Process): void {
    process.isAlive = false;
    this.crashes += 1;
    this.#onCrash.get(process)?.();
  }

  get #isOut(): boolean {
    return this.steps < this.#outage.untilStep;
  }

  #drawFate(label: string, isWrite: boolean, isConditional: boolean): keyof FaultRates | 'fine' {
    const { rates } = this;
    // Most of all histories: theirs are the writes that must be known before anything else goes on.
    const outage = label.startsWith('put histories/') ? rates.outage : rates.outage / 10;
    if (isWrite && this.#outage.untilStep <= this.steps && this.random() < outage) {
      const untilStep = this.steps + 100 + Math.floor(this.random() * 300);
      this.#outage = { label, untilStep, lateShare: [0, 0.1, 1][Math.floor(this.random() * 3)] };
    }
    const isOut = this.#isOut && this.#outage.label === label;
    if (isWrite && isOut) return this.random() < this.#outage.lateShare ? 'late' : 'failBefore';
    let x = this.random();
    for (const fate of ['crash', 'failBefore', 'failAfter', 'late', 'duplicate', 'spuriouslyLost'] as const) {
      if (!isWrite && fate !== 'crash' && fate !== 'failBefore') continue;
      if (fate === 'spuriouslyLost' && !isConditional) continue;
      x -= rates[fate];
      if (x < 0) return fate;
    }
    return 'fine';
  }

  #park(process: Process | null, run: () => void): void {
    const isStalled = this.random() < this.rates.stall;
    const fromStep = isStalled ? this.steps + Math.floor(this.random() * 400) : 0;
    this.#parked.push({ process, run, fromStep });
  }

  /** A lost answer is noticed after a time-out, and what was held up on the way arrives whenever it will. */
  #later(process: Process | null, run: () => void): void {
    const isSlow = this.#isOut && this.#outage.lateShare === 1;
    const isSoon = !isSlow && this.random() >= this.rates.slow;
    this.#parked.push({
      process,
      run,
      fromStep: isSoon ? 0 : this.steps + Math.floor((isSlow ? 200 : 0) + this.random() * 300),
    });
  }

  #choose(): number {
    // A few draws: when all of them are stalled, one of the stalled goes on.
    let i = 0;
    for (let draw = 0; draw < 4; draw++) {
      i = Math.floor(this.random() * this.#parked.length);
      if (this.#parked[i].fromStep <= this.steps) break;
    }
    return i;
  }

  /** Lets one parked process go on; false when none is parked. */
  async step(): Promise<boolean> {
    while (this.#parked.length > 0) {
      const i = this.#choose();
      const { process, run } = this.#parked[i];
      this.#parked[i] = this.#parked.at(-1) as Parked;
      this.#parked.pop();
      if (process && !process.isAlive) continue;
      this.steps += 1;
      this.nowMs += Math.floor(this.random() * 40);
      run();
      await settled();
      return true;
    }
    await settled();
    return this.#parked.length > 0;
  }
}

/** All that follows from one answer without another call of the store has happened when this resolves. */
function settled(): Promise<void> {
  return new Promise((resolve) => setImmediate(resolve));
}
