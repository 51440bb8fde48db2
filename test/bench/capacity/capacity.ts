import { requests } from '../../../src/cost/monthly-cost.ts';

/** What comes to a desk, or to all desks of an account. */
export interface Traffic {
  readonly messagesPerMonth: number;
  readonly confirmedShare: number;
  /** Busiest minute over the mean of the month. */
  readonly peakFactor: number;
  /** Months of confirmed messages in the counts. */
  readonly historyMonths: number;
}

/** What the work costs. Seconds. */
export interface Costs {
  readonly routeSeconds: number;
  readonly confirmSeconds: number;
  readonly intakeSeconds: number;
  readonly confirmBatch: number;
  /** Reading the manifest and writing it back on a condition: one at a time can. */
  readonly commitSeconds: number;
  /** Share of a commit's turns that get through while others try too. */
  readonly commitShare: number;
  readonly compactSeconds: Affine;
  readonly compactMb: Affine;
}

/** `fixed + perConfirmation · confirmations`. */
export interface Affine {
  readonly fixed: number;
  readonly perConfirmation: number;
}

export interface Limit {
  readonly max: number;
  readonly source: string;
}

/** Names of what can run out. Those of a desk grow with it alone; those of the account with all desks together. */
export const limits = {
  s3Writes: {
    max: 3500,
    source: 'a second and prefix; Amazon S3 User Guide, "Optimizing Amazon S3 performance"',
  },
  s3Reads: { max: 5500, source: 'a second and prefix; the same' },
  commits: { max: 1, source: 'of the time: one manifest a desk' },
  compactSeconds: { max: 900, source: 'AWS Lambda quotas: function timeout' },
  compactMb: { max: 2048, source: 'memory of the compact function in template.yaml; Lambda allows 10,240' },
  concurrency: {
    max: 1000,
    source: 'AWS Lambda quotas: concurrent executions of an account and region unless raised',
  },
  inFlight: { max: 120_000, source: 'Amazon SQS quotas: messages in flight of a standard queue' },
} as const satisfies Record<string, Limit>;

export type LimitName = keyof typeof limits;
export const limitsOfDesk: readonly LimitName[] = [
  's3Writes',
  's3Reads',
  'commits',
  'compactSeconds',
  'compactMb',
];

const secondsPerMonth = 30 * 24 * 3600;

/** How much of each limit is needed at the peak, in the limit's own unit. A mail is written once by the receiving service; all
 *  of a desk's keys count as one prefix, which is the worst case: S3 splits a prefix that stays busy. */
export function demandOf(traffic: Traffic, costs: Costs): Record<LimitName, number> {
  const { messagesPerMonth, confirmedShare, peakFactor, historyMonths } = traffic;
  const messages = (messagesPerMonth / secondsPerMonth) * peakFactor;
  const confirmed = messages * confirmedShare;
  const folds = confirmed / costs.confirmBatch;
  const kept = messagesPerMonth * confirmedShare * historyMonths;
  const grown = ({ fixed, perConfirmation }: Affine) => fixed + perConfirmation * kept;
  const perSecond = (of: 'reads' | 'writes') =>
    messages * (requests.message[of] + requests.routeBatch[of]) +
    confirmed * (requests.webhook[of] + requests.confirmation[of]) +
    folds * requests.fold[of];
  const running = messages * costs.routeSeconds + confirmed * (costs.confirmSeconds + costs.intakeSeconds);
  return {
    s3Writes: perSecond('writes') + messages,
    s3Reads: perSecond('reads'),
    commits: (folds * costs.commitSeconds) / costs.commitShare,
    compactSeconds: grown(costs.compactSeconds),
    compactMb: grown(costs.compactMb),
    concurrency: running,
    // A whole batch is in flight while one of it is worked on.
    inFlight: running * costs.confirmBatch,
  };
}

/** Messages a month at which a limit is met: every demand is a straight line over the messages. */
export function messagesMax(
  name: LimitName,
  traffic: Omit<Traffic, 'messagesPerMonth'>,
  costs: Costs,
): number {
  const at = (messagesPerMonth: number) => demandOf({ ...traffic, messagesPerMonth }, costs)[name];
  const fixed = at(0);
  const slope = (at(1e6) - fixed) / 1e6;
  return Math.max(0, (limits[name].max - fixed) / slope);
}

/** The most that one desk may do, and what stops it there. */
export function deskMax(
  traffic: Omit<Traffic, 'messagesPerMonth'>,
  costs: Costs,
): { readonly messages: number; readonly limit: LimitName } {
  return limitsOfDesk
    .map((limit) => ({ limit, messages: messagesMax(limit, traffic, costs) }))
    .reduce((least, each) => (each.messages < least.messages ? each : least));
}

/** Shards that a desk of so many messages needs: each with its own prefix, manifest and counts; the counts merge by adding. */
export function shardsOf(
  messagesPerMonth: number,
  traffic: Omit<Traffic, 'messagesPerMonth'>,
  costs: Costs,
): number {
  return Math.max(1, Math.ceil(messagesPerMonth / deskMax(traffic, costs).messages));
}
