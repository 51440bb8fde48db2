import { batchOf, busyShare, type Load, type Machine } from './load.ts';
import type { Prices } from './prices.ts';

export interface CostLine {
  readonly service: string;
  readonly what: string;
  readonly amount: number;
  readonly unit: string;
  readonly dollars: number;
}

/** S3 requests as the handlers make them; deletions are free. */
export const requests = {
  /** Read and head of the message; the copy that writes its metadata. */
  message: { reads: 2, writes: 1 },
  /** A look at the manifest. */
  routeBatch: { reads: 1, writes: 0 },
  /** The form document. */
  form: { reads: 0, writes: 1 },
  /** A look for the webhook's mark; the drop and the mark. */
  webhook: { reads: 1, writes: 2 },
  /** The drop, the message, its history; the history. */
  confirmation: { reads: 3, writes: 1 },
  /** The manifest twice and the list of absorbed segments; the segment and the manifest. Assumed of every fold, though
   *  only those that hold a message confirmed before, by a segment that is in the base by now, read the list. */
  fold: { reads: 3, writes: 2 },
  foldOfNew: { reads: 2, writes: 2 },
} as const;

const million = 1e6;
const kbPerGb = 1024 * 1024;
const nights = 30;
const recounts = 30 / 7;

/** Cost of one month, line by line, in US dollars; free tiers and what goes over the wire left out. */
export function monthlyCost(load: Load, machine: Machine, prices: Prices): readonly CostLine[] {
  const { messages } = load;
  const mails = messages * load.mailShare;
  const forms = messages - mails;
  const confirmed = messages * load.confirmedShare;
  const routes = messages / batchOf(messages, 1, machine.routeBatchMax);
  const folds = confirmed / batchOf(confirmed, machine.confirmWindowSeconds, machine.confirmBatchMax);
  const intakes = forms + confirmed;
  const histories = confirmed * load.historyMonths;
  // Listing pages, 1,000 keys each, are billed as writes.
  const nightly = { reads: 2000 + folds / nights, writes: 10 + histories / 1000 };
  const kept = (messages * load.rawDays) / 30;
  // Newest messages and their histories, texts of those held and of examples; the pages that list what came, four objects.
  const report = { reads: 2 * Math.min(machine.reportMessagesMax, kept) + 1000, writes: 4 + kept / 1000 };
  const recounted = histories <= machine.recountMax ? histories : 0;
  const counted: readonly (readonly [number, { readonly reads: number; readonly writes: number }])[] = [
    [mails, { reads: 0, writes: 1 }],
    [messages, requests.message],
    [routes, requests.routeBatch],
    [forms, requests.form],
    [confirmed, requests.webhook],
    [confirmed, requests.confirmation],
    [folds, requests.fold],
    // A router reads each new segment.
    [Math.min(routes, folds), { reads: 1, writes: 0 }],
    [nights, nightly],
    [nights, report],
    [recounts, { reads: recounted, writes: recounted / 1000 }],
  ];
  const reads = counted.reduce((sum, [times, each]) => sum + times * each.reads, 0);
  const writes = counted.reduce((sum, [times, each]) => sum + times * each.writes, 0);
  const compactSeconds = Math.min(
    machine.functionSecondsMax,
    machine.compactSeconds + (histories / million) * machine.compactSecondsPerMillion,
  );
  const gbSeconds =
    ((messages * machine.routeMs + confirmed * machine.confirmMs + (routes + folds) * machine.invocationMs) /
      1000) *
      (machine.routeMemoryMb / 1024) +
    ((intakes * machine.intakeMs) / 1000) * (machine.intakeMemoryMb / 1024) +
    (nights * compactSeconds + recounts * (recounted / machine.recountPerSecond)) *
      (machine.compactMemoryMb / 1024) +
    nights * machine.reportSeconds * (machine.reportMemoryMb / 1024);
  // Each message comes, is overwritten and expires; each confirmation's drop and mark come and go, its history is written.
  const events = 3 * messages + 5 * confirmed + 2 * folds;
  const rawKb = mails * load.mailKb + forms * load.formKb;
  const logBytes =
    messages * machine.routeLineBytes +
    confirmed * machine.confirmLineBytes +
    intakes * machine.intakeLineBytes +
    (routes + folds + intakes) * machine.invocationLineBytes +
    (routes + folds) * machine.metricLineBytes +
    Math.min(messages, routes * load.queues) * machine.queueLineBytes;
  const metrics =
    machine.routeMetrics * busyShare(messages) +
    machine.confirmMetrics * busyShare(confirmed) +
    (machine.compactMetrics + machine.reportMetrics) / 24 +
    load.queues * busyShare(messages / load.queues);
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
    line('S3', 'writes and listings', writes, 'requests', prices.s3WritesMillion / million),
    line('S3', 'reads', reads, 'requests', prices.s3ReadsMillion / million),
    line(
      'S3',
      'raw messages kept',
      (rawKb * (load.rawDays + load.supersededDays)) / 30 / kbPerGb,
      'GB-months',
      prices.s3GbMonth,
    ),
    line('S3', 'histories kept', (histories * machine.historyKb) / kbPerGb, 'GB-months', prices.s3GbMonth),
    line(
      'S3',
      'tables kept',
      (machine.modelMb * (machine.modelNights + load.supersededDays)) / 1024,
      'GB-months',
      prices.s3GbMonth,
    ),
    line('EventBridge', 'events of the bucket', events, 'events', prices.eventBridgeMillion / million),
    line(
      'SQS',
      'send, receive, delete',
      messages + confirmed + 2 * (routes + folds) + machine.idlePolls,
      'requests',
      prices.sqsRequestsMillion / million,
    ),
    line(
      'Lambda',
      'invocations',
      routes + folds + intakes + nights + recounts,
      'requests',
      prices.lambdaRequestsMillion / million,
    ),
    line('Lambda', 'time', gbSeconds, 'GB-seconds', prices.lambdaGbSecond),
    line('CloudWatch', 'logs', logBytes / 1024 ** 3, 'GB', prices.logsGb),
    line('CloudWatch', 'metrics', metrics, 'metric-months', prices.metricMonth),
    line('CloudWatch', 'alarms', machine.alarmMetrics, 'metrics watched', prices.alarmMonth),
    line('CloudWatch', 'dashboard', machine.dashboards, 'dashboards', prices.dashboardMonth),
    line('Secrets Manager', 'secrets', machine.secrets, 'secrets', prices.secretMonth),
  ];
}

export function totalDollars(lines: readonly CostLine[]): number {
  return lines.reduce((sum, one) => sum + one.dollars, 0);
}
