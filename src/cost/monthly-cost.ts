import type { Prices } from './prices.ts';

/** What a desk does in a month, as far as it costs. */
export interface Load {
  readonly messages: number;
  /** Share that comes by mail; the rest are forms through the intake. */
  readonly mailShare: number;
  readonly mailKb: number;
  readonly formKb: number;
  /** Share of messages that somebody confirms or corrects. */
  readonly confirmedShare: number;
  /** Messages of one route invocation, confirmations of one fold. At low volume batches hold one. */
  readonly routeBatch: number;
  readonly confirmBatch: number;
  /** Billed for one message, parse to metadata. */
  readonly routeMs: number;
  readonly confirmMs: number;
  /** Billed once an invocation: init when cold, reading the table's version when warm; a mean. */
  readonly invocationMs: number;
  readonly routeMemoryMb: number;
  readonly compactSeconds: number;
  readonly compactMemoryMb: number;
  readonly rawDays: number;
  readonly historyKb: number;
  /** Months of histories kept. */
  readonly historyMonths: number;
  readonly logBytesPerMessage: number;
  readonly alarms: number;
  readonly metrics: number;
}

export const ordinaryLoad: Omit<Load, 'messages' | 'routeBatch' | 'confirmBatch'> = {
  mailShare: 0.8,
  mailKb: 60,
  formKb: 2,
  confirmedShare: 0.4,
  routeMs: 25,
  confirmMs: 30,
  invocationMs: 60,
  routeMemoryMb: 512,
  compactSeconds: 60,
  compactMemoryMb: 2048,
  rawDays: 90,
  historyKb: 12,
  historyMonths: 24,
  logBytesPerMessage: 400,
  alarms: 8,
  metrics: 12,
};

/** Batches fill with the traffic: the mean arrivals within one batching window, at least one, at most the batch size. */
export function batchOf(messagesPerMonth: number, windowSeconds: number, batchMax: number): number {
  const perSecond = messagesPerMonth / (30 * 24 * 3600);
  return Math.min(batchMax, Math.max(1, perSecond * windowSeconds));
}

export interface CostLine {
  readonly service: string;
  readonly what: string;
  readonly amount: number;
  readonly unit: string;
  readonly dollars: number;
}

const million = 1e6;
const kbPerGb = 1024 * 1024;

/** Cost of one month, line by line, in US dollars; free tiers left out.
 *  Requests counted as the handlers make them: a route reads the message and writes its metadata by one copy; a batch reads
 *  the manifest once and, when a fold landed since, one segment; a confirmation is a drop read, the message read, a history
 *  read and written; a fold writes a segment and the manifest. */
export function monthlyCost(load: Load, prices: Prices): readonly CostLine[] {
  const mails = load.messages * load.mailShare;
  const forms = load.messages - mails;
  const confirmed = load.messages * load.confirmedShare;
  const routes = load.messages / load.routeBatch;
  const folds = confirmed / load.confirmBatch;
  const nights = 30;
  const intakes = forms + confirmed;
  const writes = load.messages + load.messages + confirmed * 3 + folds * 2 + nights * 10;
  const reads = load.messages + routes + folds * 2 + confirmed * 4 + nights * 2000;
  const gbSeconds =
    ((load.messages * load.routeMs +
      confirmed * load.confirmMs +
      (routes + folds + intakes) * load.invocationMs) /
      1000) *
      (load.routeMemoryMb / 1024) +
    nights * load.compactSeconds * (load.compactMemoryMb / 1024);
  const rawGb = ((mails * load.mailKb + forms * load.formKb) * load.rawDays) / 30 / kbPerGb;
  const historyGb = (confirmed * load.historyKb * load.historyMonths) / kbPerGb;
  const line = (service: string, what: string, amount: number, unit: string, price: number): CostLine => ({
    service,
    what,
    amount,
    unit,
    dollars: amount * price,
  });
  return [
    line('SES', 'mail received', mails, 'messages', prices.sesMessagesMillion / million),
    line(
      'SES',
      'mail content',
      mails * Math.ceil(load.mailKb / 256),
      '256 KB chunks',
      prices.sesChunksMillion / million,
    ),
    line('S3', 'writes', writes, 'requests', prices.s3WritesMillion / million),
    line('S3', 'reads', reads, 'requests', prices.s3ReadsMillion / million),
    line('S3', 'raw messages kept', rawGb, 'GB-months', prices.s3GbMonth),
    line('S3', 'histories kept', historyGb, 'GB-months', prices.s3GbMonth),
    line(
      'SQS',
      'send, receive, delete',
      load.messages + confirmed + 2 * (routes + folds),
      'requests',
      prices.sqsRequestsMillion / million,
    ),
    line(
      'Lambda',
      'invocations',
      routes + folds + intakes + nights,
      'requests',
      prices.lambdaRequestsMillion / million,
    ),
    line('Lambda', 'time', gbSeconds, 'GB-seconds', prices.lambdaGbSecond),
    line('CloudWatch', 'logs', (load.messages * load.logBytesPerMessage) / 1024 ** 3, 'GB', prices.logsGb),
    line('CloudWatch', 'alarms', load.alarms, 'alarms', prices.alarmMonth),
    line('CloudWatch', 'metrics', load.metrics, 'metrics', prices.metricMonth),
  ];
}

export function totalDollars(lines: readonly CostLine[]): number {
  return lines.reduce((sum, one) => sum + one.dollars, 0);
}
