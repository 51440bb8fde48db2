import { bounds } from '../bounds.ts';

/** What is measured. `sum`: counts of one invocation add up; `all`: each value counts by itself; `last`: a level, of which
 *  only the newest is told. Units are those that CloudWatch knows. */
export const metrics = {
  // Messages, by what became of them.
  Routed: { unit: 'Count', merge: 'sum' },
  Held: { unit: 'Count', merge: 'sum' },
  Guarded: { unit: 'Count', merge: 'sum' },
  /** Messages and confirmations to be delivered again. */
  Failed: { unit: 'Count', merge: 'sum' },
  // Routed and held messages by the probability stated: a shift between bands shows before confirmations can.
  PosteriorBelow50: { unit: 'Count', merge: 'sum' },
  PosteriorFrom50: { unit: 'Count', merge: 'sum' },
  PosteriorFrom80: { unit: 'Count', merge: 'sum' },
  PosteriorFrom95: { unit: 'Count', merge: 'sum' },
  PosteriorFrom99: { unit: 'Count', merge: 'sum' },
  /** Messages sent to one queue, routed or guarded. */
  ToQueue: { unit: 'Count', merge: 'sum' },
  // Confirmations.
  Folded: { unit: 'Count', merge: 'sum' },
  Refused: { unit: 'Count', merge: 'sum' },
  /** From the time that a confirmation states to its fold. */
  FoldLagSeconds: { unit: 'Seconds', merge: 'all' },
  // The table.
  SegmentsWaiting: { unit: 'Count', merge: 'last' },
  Compactions: { unit: 'Count', merge: 'sum' },
  CompactionSeconds: { unit: 'Seconds', merge: 'all' },
  MessagesCounted: { unit: 'Count', merge: 'last' },
  Cells: { unit: 'Count', merge: 'last' },
  BaseBytes: { unit: 'Bytes', merge: 'last' },
  TableBytes: { unit: 'Bytes', merge: 'last' },
  /** Cells in which the table and a recount differ; 1 also stands for a table that could not be read. */
  RecountDifferences: { unit: 'Count', merge: 'last' },
  // The report.
  Reports: { unit: 'Count', merge: 'sum' },
} as const satisfies Record<string, { unit: 'Count' | 'Seconds' | 'Bytes'; merge: 'sum' | 'all' | 'last' }>;

export type MetricName = keyof typeof metrics;

/** Values of some metrics, of the whole desk (`queue` null) or of one queue. */
export interface Measurement {
  readonly queue: string | null;
  readonly values: Readonly<Partial<Record<MetricName, readonly number[]>>>;
}

/** A line of the structured log, as far as it is measured. */
export interface Line {
  readonly event: string;
  readonly [member: string]: unknown;
}

/** Lower edges of the bands of the stated probability; a message falls in the last that it reaches. */
const bands: readonly (readonly [from: number, name: MetricName])[] = [
  [0, 'PosteriorBelow50'],
  [0.5, 'PosteriorFrom50'],
  [0.8, 'PosteriorFrom80'],
  [0.95, 'PosteriorFrom95'],
  [0.99, 'PosteriorFrom99'],
];

/** Stands for all queues beyond the bound; no queue can have this id. */
export const otherQueues = '(others)';

/** What a batch's own log lines say of its messages. `queues`: ids in the desk's order; the first `metricQueuesMax` are told
 *  apart. `segments`: those beside the base when the batch was routed; null: not known. */
export function measureRouting(
  lines: readonly Line[],
  queues: readonly string[],
  segments: number | null,
): Measurement[] {
  const sums = new Map<MetricName, number>([
    ['Routed', 0],
    ['Held', 0],
    ['Guarded', 0],
  ]);
  const byQueue = new Map<string, number>();
  const named = new Set(queues.slice(0, bounds.metricQueuesMax));
  for (const { event, queue, posterior } of lines) {
    const name =
      event === 'routed' ? 'Routed' : event === 'held' ? 'Held' : event === 'guarded' ? 'Guarded' : null;
    if (name === null) continue;
    add(sums, name);
    if (name !== 'Held' && typeof queue === 'string') add(byQueue, named.has(queue) ? queue : otherQueues);
    if (name !== 'Guarded' && typeof queue === 'string' && typeof posterior === 'number')
      add(sums, bands.findLast(([from]) => posterior >= from)?.[1] ?? 'PosteriorBelow50');
  }
  const values = Object.fromEntries([...sums].map(([name, sum]) => [name, [sum]]));
  return [
    { queue: null, values: segments === null ? values : { ...values, SegmentsWaiting: [segments] } },
    ...[...byQueue].map(([queue, sum]) => ({ queue, values: { ToQueue: [sum] } })),
  ];
}

/** What a batch's own log lines say of its confirmations. */
export function measureFolding(lines: readonly Line[]): Measurement[] {
  const folded = lines.filter(({ event }) => event === 'confirmation-folded');
  const lags = folded.flatMap(({ lagMs }) => (typeof lagMs === 'number' ? [Math.max(0, lagMs) / 1000] : []));
  const refused = lines.filter(({ event }) => event === 'confirmation-refused').length;
  return [{ queue: null, values: { Folded: [folded.length], Refused: [refused], FoldLagSeconds: lags } }];
}

/** What a compaction measured; sizes only when it made a new base. */
export interface Compacted {
  readonly kind: string;
  readonly messages: number;
  readonly cells: number;
  readonly baseBytes: number;
  readonly tableBytes: number;
}

export function measureCompaction(
  { kind, messages, cells, baseBytes, tableBytes }: Compacted,
  tookMs: number,
): Measurement[] {
  const sizes = {
    SegmentsWaiting: [0],
    MessagesCounted: [messages],
    Cells: [cells],
    BaseBytes: [baseBytes],
    TableBytes: [tableBytes],
  };
  const values = {
    Compactions: [1],
    CompactionSeconds: [tookMs / 1000],
    ...(kind === 'compacted' ? sizes : {}),
  };
  return [{ queue: null, values }];
}

export function measureReport(): Measurement[] {
  return [{ queue: null, values: { Reports: [1] } }];
}

/** `fault`: why the table could not be read, if it could not. */
export function measureRecount(result: {
  readonly differences: number;
  readonly fault: unknown;
}): Measurement[] {
  const differences = Math.max(result.differences, result.fault === null ? 0 : 1);
  return [{ queue: null, values: { RecountDifferences: [differences] } }];
}

function add<K>(sums: Map<K, number>, name: K): void {
  sums.set(name, (sums.get(name) ?? 0) + 1);
}
