import { bounds } from '../bounds.ts';
import { type Measurement, type MetricName, metrics } from './measurement.ts';

export const namespace = 'Tallypost';

/** One line of log from which CloudWatch takes metrics. */
export type EmfDocument = Readonly<Record<string, unknown>>;

/** Measurements of one invocation as documents in CloudWatch's embedded metric format: one for the desk and one for each
 *  queue, each a line of log of its own, `_aws` at the root. `desk`: the dimension by which desks of one account are told
 *  apart, made printable ASCII. Source: Amazon CloudWatch User Guide, "Specification: Embedded metric format". */
export function documentsOf(measurements: readonly Measurement[], desk: string, atMs: number): EmfDocument[] {
  const byQueue = new Map<string | null, Map<MetricName, readonly number[]>>();
  for (const { queue, values } of measurements) {
    const merged = byQueue.get(queue) ?? new Map<MetricName, readonly number[]>();
    for (const name of Object.keys(values) as MetricName[])
      merged.set(name, merge(name, merged.get(name) ?? [], values[name] ?? []));
    byQueue.set(queue, merged);
  }
  const shown = desk.replace(/[^\x21-\x7e]/g, '?').slice(0, 255) || '?';
  return [...byQueue].flatMap(([queue, merged]) =>
    partsOf(merged).map((part) =>
      documentOf(part, { Desk: shown, ...(queue === null ? {} : { Queue: queue }) }, atMs),
    ),
  );
}

function merge(name: MetricName, before: readonly number[], more: readonly number[]): readonly number[] {
  if (more.length === 0) return before;
  const { merge } = metrics[name];
  if (merge === 'last') return more.slice(-1);
  if (merge === 'all') return [...before, ...more];
  return [[...before, ...more].reduce((sum, value) => sum + value, 0)];
}

type Part = readonly (readonly [MetricName, readonly number[]])[];

/** A metric may have so many values in one document: the rest goes into further ones. */
function partsOf(merged: ReadonlyMap<MetricName, readonly number[]>): Part[] {
  const max = bounds.emfValuesMax;
  const longest = Math.max(...[...merged.values()].map((values) => values.length));
  return Array.from({ length: Math.ceil(longest / max) }, (_, i) =>
    [...merged]
      .map(([name, values]) => [name, values.slice(i * max, (i + 1) * max)] as const)
      .filter(([, values]) => values.length > 0),
  );
}

function documentOf(part: Part, dimensions: Readonly<Record<string, string>>, atMs: number): EmfDocument {
  const directive = {
    Namespace: namespace,
    Dimensions: [Object.keys(dimensions)],
    Metrics: part.map(([name]) => ({ Name: name, Unit: metrics[name].unit })),
  };
  return {
    _aws: { Timestamp: atMs, CloudWatchMetrics: [directive] },
    ...dimensions,
    ...Object.fromEntries(part.map(([name, values]) => [name, values.length === 1 ? values[0] : values])),
  };
}
