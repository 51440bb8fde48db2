import { bounds } from '../bounds.ts';
import type { Decision } from '../decision/decision.ts';
import { TallypostError } from '../errors.ts';
import type { Said } from '../model/counts.ts';
import type { Posterior } from '../model/posterior.ts';
import { traceMetadata } from '../store/keys.ts';

export type Metadata = Readonly<Record<string, string>>;

/** Where and by what a decision was made. */
export interface DecisionContext {
  readonly modelVersion: number;
  readonly schema: string;
  readonly atMs: number;
  readonly trace: string;
}

const own = 'tallypost-';
/** Written out: names put together anew for every message took as long as a guard. */
const names = {
  decision: 'tallypost-decision',
  queue: 'tallypost-queue',
  posterior: 'tallypost-posterior',
  reason: 'tallypost-reason',
  audit: 'tallypost-audit',
  runnerUp: 'tallypost-runner-up',
  runnerUpPosterior: 'tallypost-runner-up-posterior',
  model: 'tallypost-model',
  schema: 'tallypost-schema',
  at: 'tallypost-at',
  trace: 'tallypost-trace',
} as const;
/** What goes first when an object has little room for metadata left: the decision, its queue and its posterior stay. */
const dispensable = [
  names.trace,
  names.schema,
  names.model,
  names.runnerUpPosterior,
  names.runnerUp,
  names.at,
] as const;

export function isDecided(metadata: Metadata): boolean {
  return Object.hasOwn(metadata, names.decision);
}

/** What is written about a decision. All values are printable ASCII: ids of the desk's file, numbers, times. */
export function metadataOf(decision: Decision, posterior: Posterior, context: DecisionContext): Metadata {
  const metadata: Record<string, string> = {};
  const put = (name: string, value: string) => {
    if (value !== '') metadata[name] = value;
  };
  put(names.decision, decision.kind);
  put(names.queue, decision.queue ?? '');
  if (decision.queue !== null) put(names.posterior, decision.posterior.toFixed(6));
  if (decision.kind === 'held') put(names.reason, decision.reason);
  if (decision.kind === 'guarded') put(names.reason, decision.guard);
  if (decision.kind === 'routed' && decision.isAudit) put(names.audit, 'yes');
  const next = decision.queue === null ? -1 : runnerUp(posterior, decision.queue);
  put(names.runnerUp, posterior.queues[next] ?? '');
  put(names.runnerUpPosterior, posterior.probability[next]?.toFixed(6) ?? '');
  put(names.model, String(context.modelVersion));
  put(names.schema, context.schema);
  put(names.at, new Date(context.atMs).toISOString());
  put(names.trace, context.trace);
  return metadata;
}

/** The object's other metadata with ours on top, within the 2 KB that an object may have.
 *  Throws TallypostError `metadata-full` when the others leave no room even for the decision. */
export function joinMetadata(others: Metadata, ours: Metadata, place: string): Metadata {
  const joined = Object.fromEntries(Object.entries(others).filter(([name]) => !name.startsWith(own)));
  Object.assign(joined, ours);
  for (const name of dispensable) {
    if (sizeOf(joined) <= bounds.metadataBytesMax) return joined;
    delete joined[name];
  }
  if (sizeOf(joined) <= bounds.metadataBytesMax) return joined;
  throw new TallypostError({
    code: 'metadata-full',
    place,
    expected: `at most ${bounds.metadataBytesMax} bytes with the decision`,
    got: `${sizeOf(joined)} bytes`,
  });
}

/** What was said of the message when it was routed or held; null when nothing was, or a guard decided. */
export function saidIn(metadata: Metadata): Said | null {
  const kind = metadata[names.decision];
  const queue = metadata[names.queue];
  const posterior = Number(metadata[names.posterior] ?? Number.NaN);
  if ((kind !== 'routed' && kind !== 'held') || !queue || !(posterior >= 0 && posterior <= 1)) return null;
  return { queue, posterior, isAudit: metadata[names.audit] === 'yes' };
}

export function traceIn(metadata: Metadata): string {
  return metadata[traceMetadata] ?? '';
}

function runnerUp({ queues, probability }: Posterior, queue: string): number {
  let best = -1;
  queues.forEach((each, k) => {
    if (each !== queue && (best === -1 || probability[k]! > probability[best]!)) best = k;
  });
  return best;
}

function sizeOf(metadata: Metadata): number {
  let bytes = 0;
  for (const name of Object.keys(metadata)) bytes += name.length + Buffer.byteLength(metadata[name]!);
  return bytes;
}
