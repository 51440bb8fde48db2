import { bounds } from '../bounds.ts';

/** What a desk does in a month, as far as it costs. */
export interface Load {
  readonly messages: number;
  /** Share that comes by mail; the rest are forms through the intake. */
  readonly mailShare: number;
  readonly mailKb: number;
  readonly formKb: number;
  /** Share of messages that somebody confirms or corrects, by webhook through the intake. */
  readonly confirmedShare: number;
  readonly queues: number;
  readonly rawDays: number;
  /** Days that overwritten and deleted objects are kept: routing overwrites a message's metadata. */
  readonly supersededDays: number;
  /** Months of confirmed messages in the counts; their histories are kept and recounted. */
  readonly historyMonths: number;
}

export const ordinaryLoad: Omit<Load, 'messages'> = {
  mailShare: 0.8,
  mailKb: 60,
  formKb: 2,
  confirmedShare: 0.4,
  queues: 10,
  rawDays: 90,
  supersededDays: 7,
  historyMonths: 24,
};

/** How the stack of template.yaml works it off. */
export interface Machine {
  /** Messages of one route invocation at most; a poller takes what came within its last second. */
  readonly routeBatchMax: number;
  readonly confirmBatchMax: number;
  readonly confirmWindowSeconds: number;
  /** Billed for one message, parse to metadata, waiting for the store included. */
  readonly routeMs: number;
  readonly confirmMs: number;
  readonly intakeMs: number;
  /** Billed once an invocation: start when cold, a look at the desk and the model. */
  readonly invocationMs: number;
  readonly routeMemoryMb: number;
  readonly intakeMemoryMb: number;
  readonly compactMemoryMb: number;
  /** A night's compaction, and for every million histories that it lists. */
  readonly compactSeconds: number;
  readonly compactSecondsPerMillion: number;
  /** The morning's report: newest messages that it looks at, two reads each; all it bills besides does not grow. */
  readonly reportMessagesMax: number;
  readonly reportSeconds: number;
  readonly reportMemoryMb: number;
  /** Histories that the weekly recount reads in a second; of more than the most it reads none. */
  readonly recountPerSecond: number;
  readonly recountMax: number;
  readonly functionSecondsMax: number;
  readonly historyKb: number;
  /** Base and table of one night; as many nights of them are kept as a confirmation may be late, and the days after. */
  readonly modelMb: number;
  readonly modelNights: number;
  /** Receives of two queues by their pollers when nothing comes: five each, every 20 s. */
  readonly idlePolls: number;
  /** Bytes of log: a message's line, a confirmation's, a request's; the lines of Lambda and of metrics for an invocation. */
  readonly routeLineBytes: number;
  readonly confirmLineBytes: number;
  readonly intakeLineBytes: number;
  readonly invocationLineBytes: number;
  readonly metricLineBytes: number;
  readonly queueLineBytes: number;
  /** Custom metrics of the desk by the function that writes them. */
  readonly routeMetrics: number;
  readonly confirmMetrics: number;
  readonly compactMetrics: number;
  readonly reportMetrics: number;
  /** Metrics that alarms look at. */
  readonly alarmMetrics: number;
  readonly secrets: number;
  readonly dashboards: number;
}

export const machineOfTemplate: Machine = {
  routeBatchMax: 10,
  confirmBatchMax: 100,
  confirmWindowSeconds: 20,
  routeMs: 60,
  confirmMs: 40,
  intakeMs: 40,
  invocationMs: 60,
  routeMemoryMb: 1024,
  intakeMemoryMb: 512,
  compactMemoryMb: 2048,
  compactSeconds: 30,
  compactSecondsPerMillion: 100,
  reportMessagesMax: bounds.reportMessagesMax,
  reportSeconds: 60,
  reportMemoryMb: 2048,
  recountPerSecond: 800,
  recountMax: bounds.functionRecountMax,
  functionSecondsMax: 900,
  historyKb: 12,
  modelMb: 60,
  modelNights: 15,
  idlePolls: 2 * 5 * 3 * 60 * 24 * 30,
  routeLineBytes: 400,
  confirmLineBytes: 400,
  intakeLineBytes: 300,
  invocationLineBytes: 350,
  metricLineBytes: 900,
  queueLineBytes: 320,
  routeMetrics: 10,
  confirmMetrics: 3,
  compactMetrics: 7,
  reportMetrics: 1,
  alarmMetrics: 18,
  secrets: 2,
  dashboards: 1,
};

/** Batches fill with the traffic: the mean arrivals within one batching window, at least one, at most the batch size. */
export function batchOf(messagesPerMonth: number, windowSeconds: number, batchMax: number): number {
  const perSecond = messagesPerMonth / (30 * 24 * 3600);
  return Math.min(batchMax, Math.max(1, perSecond * windowSeconds));
}

/** Share of the month's hours in which something comes that comes `perMonth` times, at random. */
export function busyShare(perMonth: number): number {
  return 1 - Math.exp(-perMonth / 720);
}
