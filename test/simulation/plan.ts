import type { QueueChange } from '../../src/ledger/queues.ts';
import { desk, startMs } from '../ledger/fixture.ts';
import type { Delivered } from './oracle.ts';
import { type FaultRates, noFaults } from './scheduler.ts';

/** What a run consists of; drawn from its seed. Each run leaves out some of it: a rare fault shows best among few others. */
export interface Plan {
  readonly messages: readonly string[];
  readonly drops: readonly Delivered[];
  readonly rates: FaultRates;
  readonly processesMax: number;
  readonly jobs: readonly Job[];
  /** How often two weeks and more pass between two calls. */
  readonly longPauseRate: number;
  readonly skewMsMax: number;
  readonly patienceMs: number;
}

export type Job =
  | { readonly kind: 'fold'; readonly drops: readonly Delivered[] }
  | { readonly kind: 'route' | 'compact' | 'recount' | 'restore' }
  | { readonly kind: 'erase'; readonly message: string }
  | { readonly kind: 'undo'; readonly by: string; readonly sinceMs: number; readonly untilMs: number }
  | { readonly kind: 'queue'; readonly change: QueueChange };

const queues = desk.queues.map((q) => q.id);
const people = ['ann', 'bob', 'import'];
const minuteMs = 60_000;
const dayMs = 24 * 3600_000;
/** Confirmations lie before the start by more than any clock is wrong. */
const confirmedMs = startMs - 5 * dayMs;

export function drawPlan(random: () => number): Plan {
  const pick = (count: number) => Math.floor(random() * count);
  const oneOf = <T>(items: readonly T[]): T => items[pick(items.length)];
  const messages = Array.from({ length: 2 + pick(4) }, (_, i) => `message-${i}`);
  const drawn = Array.from({ length: 3 + pick(9) }, (): Delivered => {
    const at = new Date(confirmedMs + pick(4) * minuteMs - pick(3) * 7 * dayMs).toISOString();
    const confirmation = { message: oneOf(messages), queue: queues[pick(3)], by: oneOf(people), at };
    return { confirmation, startedAt: null, acknowledgedAt: null };
  });
  // Equal confirmations are one confirmation.
  const drops = [...new Map(drawn.map((d) => [JSON.stringify(d.confirmation), d])).values()];
  // Some runs are about one kind of trouble alone.
  const theme = oneOf(['mixed', 'mixed', 'mixed', 'mixed', 'outages', 'pauses', 'lost answers']);
  const batched = theme === 'outages' ? 0.5 : oneOf([0.1, 0.4]);
  const jobs = drops.map(
    (drop): Job => ({
      kind: 'fold',
      drops: [drop, ...drops.filter((d) => d !== drop && random() < batched)],
    }),
  );
  const sometimes = (p: number, times: number, job: () => Job) => {
    if (random() >= p) return;
    for (let i = pick(times); i >= 0; i--) jobs.push(job());
  };
  const compactions = theme === 'pauses' || theme === 'lost answers' ? 8 : 3;
  sometimes(0.8, compactions, () => ({ kind: 'compact' }));
  sometimes(0.5, 3, () => ({ kind: 'route' }));
  sometimes(0.3, 2, () => ({ kind: 'recount' }));
  sometimes(0.25, 2, () => ({ kind: 'erase', message: oneOf(messages) }));
  sometimes(0.25, 2, () => ({
    kind: 'undo',
    by: oneOf(people),
    sinceMs: 0,
    untilMs: confirmedMs + pick(4) * minuteMs,
  }));
  sometimes(0.25, 2, () => ({ kind: 'restore' }));
  sometimes(0.2, 3, () => ({ kind: 'queue', change: drawChange(pick) }));
  for (let i = jobs.length - 1; i > 0; i--) {
    const j = pick(i + 1);
    [jobs[i], jobs[j]] = [jobs[j], jobs[i]];
  }
  return {
    messages,
    drops,
    rates: ratesOf(theme, random, oneOf([0, 0.01, 0.04, 0.1])),
    processesMax: theme === 'lost answers' ? 4 + pick(4) : 1 + pick(6),
    jobs,
    longPauseRate: theme === 'pauses' ? 0.02 : random() < 0.2 ? 0.004 : 0,
    skewMsMax: oneOf([0, 1000, 3 * dayMs]),
    patienceMs: oneOf([0, 300, 20_000]),
  };
}

function ratesOf(theme: string, random: () => number, level: number): FaultRates {
  if (theme === 'outages') return { ...noFaults, outage: 0.15 };
  if (theme === 'lost answers') return { ...noFaults, failAfter: 0.15, spuriouslyLost: 0.1, slow: 1 };
  if (theme === 'pauses') return { ...noFaults, stall: 0.1 };
  const rate = () => (random() < 0.5 ? level * random() : 0);
  return {
    crash: rate(),
    failBefore: rate(),
    failAfter: rate(),
    late: rate(),
    duplicate: rate(),
    spuriouslyLost: rate(),
    slow: 0.5,
    stall: random() < 0.4 ? 0.05 * random() : 0,
    outage: random() < 0.3 ? 0.05 * random() : 0,
  };
}

function drawChange(pick: (count: number) => number): QueueChange {
  const [a, b] = [queues[pick(3)], queues[pick(3)]];
  const kind = pick(4);
  if (kind === 0) return { kind: 'rename', from: a, to: `${a}-new` };
  if (kind === 1) return { kind: 'merge', from: a, into: b };
  if (kind === 2) return { kind: 'retire', queue: a, successor: b };
  return { kind: 'open', queue: a, title: a };
}
