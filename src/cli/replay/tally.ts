import type { Decision } from '../../decision/decision.ts';
import type { Desk } from '../../desk/desk.ts';
import type { Posterior } from '../../model/posterior.ts';
import {
  calibrationBins,
  measure,
  type Outcome,
  routedShareAt,
  routingCurve,
  thinCurve,
  wilsonInterval,
} from './metrics.ts';

/** What was predicted against what was true, message by message, in order. */
export interface Tally {
  /** `truth` is null for a queue that the desk does not have: never right, and of probability 0. */
  add(posterior: Posterior, decision: Decision, truth: string | null): void;
  readonly count: number;
  /** JSON-able. */
  summary(): TallySummary;
}

export type TallySummary = ReturnType<typeof summarise>;

interface Row extends Outcome {
  readonly likeliest: string;
  readonly truth: string | null;
  readonly decision: Decision;
}

export function createTally(desk: Desk): Tally {
  const rows: Row[] = [];
  return {
    add(posterior, decision, truth) {
      let best = 0;
      posterior.probability.forEach((p, k) => {
        if (p > posterior.probability[best]) best = k;
      });
      const at = truth === null ? -1 : posterior.queues.indexOf(truth);
      rows.push({
        top: posterior.probability[best] ?? 0,
        likeliest: posterior.queues[best] ?? '',
        isRight: at >= 0 && at === best,
        trueProbability: at >= 0 ? posterior.probability[at] : 0,
        truth,
        decision,
      });
    },
    get count() {
      return rows.length;
    },
    summary: () => summarise(desk, rows),
  };
}

const curvePoints = 20;
const confusionsListed = 15;
/** Where a desk has seen enough to be judged by; the start of a replay in order is reported apart. */
const warmUpMessages = 300;

function summarise(desk: Desk, rows: readonly Row[]) {
  const curve = routingCurve(rows);
  const routableAt = (precision: number) => routedShareAt(curve, precision);
  const decisions = countDecisions(rows);
  return {
    ...measure(rows),
    heldShare: rows.length === 0 ? 0 : decisions.held / rows.length,
    unknownQueue: rows.filter((row) => row.truth === null).length,
    decisions,
    staffMinutes: staffMinutes(desk, rows),
    routableAt: {
      '0.90': routableAt(0.9),
      '0.95': routableAt(0.95),
      '0.98': routableAt(0.98),
      '0.99': routableAt(0.99),
    },
    curve: thinCurve(curve, curvePoints),
    calibration: calibrationBins(rows, curvePoints / 2),
    confusions: confusions(rows),
    afterWarmUp:
      rows.length > warmUpMessages
        ? { skipped: warmUpMessages, ...measure(rows.slice(warmUpMessages)) }
        : null,
  };
}

function countDecisions(rows: readonly Row[]) {
  const counts = { routed: 0, routedRight: 0, held: 0, guarded: 0, guardedRight: 0 };
  const heldBy: Record<string, number> = {};
  for (const { decision, truth } of rows) {
    if (decision.kind === 'held') {
      counts.held += 1;
      heldBy[decision.reason] = (heldBy[decision.reason] ?? 0) + 1;
    } else {
      const isRight = decision.queue === truth;
      counts[decision.kind] += 1;
      if (isRight) counts[decision.kind === 'routed' ? 'routedRight' : 'guardedRight'] += 1;
    }
  }
  return {
    ...counts,
    heldBy,
    routedPrecision: counts.routed === 0 ? null : counts.routedRight / counts.routed,
    routedPrecisionInterval: wilsonInterval(counts.routedRight, counts.routed),
  };
}

/** Under the desk's costs: a look at every message, against a look at each held one and the loss of each wrong route. */
function staffMinutes(desk: Desk, rows: readonly Row[]) {
  const wrong = new Map(desk.queues.map((queue) => [queue.id, queue.wrongRouteMinutes]));
  let spent = 0;
  for (const { decision, truth } of rows) {
    if (decision.kind === 'held') spent += desk.costs.lookMinutes;
    else if (decision.queue !== truth) spent += wrong.get(decision.queue) ?? desk.costs.wrongRouteMinutes;
  }
  const lookAtEach = rows.length * desk.costs.lookMinutes;
  return {
    lookMinutes: desk.costs.lookMinutes,
    wrongRouteMinutes: desk.costs.wrongRouteMinutes,
    lookAtEach,
    withRouting: spent,
    saved: lookAtEach - spent,
  };
}

/** The most frequent mistakes: what was likeliest, what was true. */
function confusions(rows: readonly Row[]) {
  const counts = new Map<string, { said: string; truth: string | null; messages: number }>();
  for (const { isRight, likeliest, truth } of rows) {
    if (isRight) continue;
    const key = JSON.stringify([likeliest, truth]);
    const pair = counts.get(key) ?? { said: likeliest, truth, messages: 0 };
    pair.messages += 1;
    counts.set(key, pair);
  }
  return [...counts.values()].sort((a, b) => b.messages - a.messages).slice(0, confusionsListed);
}
