import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import type { Schema } from '../features/schema.ts';
import { excessOf } from '../model/bursts.ts';
import type { CountsView } from '../model/counts.ts';
import { findDrift } from '../model/drift.ts';
import { fitFindings } from '../model/fit-table.ts';
import { cellCount } from '../model/rows.ts';
import { readManifest } from './commit.ts';
import { deleteUnnamed } from './deletion.ts';
import { finishOrders } from './finish-orders.ts';
import { checkSchema, isPurgeDue } from './manifest.ts';
import { readCapped, withFresh } from './objects.ts';
import { type ContradictedMessage, type FitModel, type MadeTable, newBaseId, rebuild } from './rebuild.ts';
import type { World } from './world.ts';

export interface CompactionOptions {
  /** Make a new base and fit also when no segment landed since the last one. */
  readonly force?: boolean;
  readonly dryRun?: boolean;
  readonly fitModel?: FitModel;
}

/** Evidence that a queue's wording of the last weeks differs from before. */
export interface ChangedQueue {
  readonly queue: string;
  readonly region: string;
  readonly earlierMessages: number;
  readonly recentMessages: number;
  /** Nats; above 5 is very strong. */
  readonly logFactor: number;
}

/** JSON-able. */
export interface CompactionResult {
  readonly kind: 'compacted' | 'nothing-new' | 'lost-race' | 'dry-run';
  /** Of the manifest now. */
  readonly version: number;
  /** Confirmed messages in the counts. */
  readonly messages: number;
  readonly columns: number;
  /** Token cells of the base, all epochs. */
  readonly cells: number;
  /** Absorbed by this compaction. */
  readonly segments: number;
  readonly baseBytes: number;
  readonly tableBytes: number;
  readonly fit: { readonly messages: number; readonly logLoss: number | null } | null;
  /** Distinct tokens counted, and those held by the table that routers load. */
  readonly tokens: { readonly counted: number; readonly held: number };
  /** Messages that hardly differ, over `burstCountedMax` of them under one queue in one week: how many such bursts may go on, and how
   *  many messages stand in the base and not in the table that routers load. */
  readonly bursts: { readonly groups: number; readonly uncounted: number };
  /** Confirmations that everything else contradicts, least likely first. */
  readonly contradictions: readonly ContradictedMessage[];
  /** Queues whose wording changed lately, strongest evidence first. */
  readonly drift: readonly ChangedQueue[];
  /** Erasures and undos of crashed processes that were brought to their end. */
  readonly orders: number;
  /** Those that could not be finished now. */
  readonly ordersLeft: number;
  readonly deletedObjects: number;
}

/** Adds base and segments, fits, checks the identities, writes a new base and served table and commits them; then deletes what no
 *  manifest within the horizon names. First brings to an end what crashed processes began. Any number may run at once: one
 *  wins, the others find out. Throws TallypostError `schema-mismatch`, `object-missing`, `object-damaged`, `counts-...`. */
export async function compact(
  world: World,
  desk: Desk,
  schema: Schema,
  options: CompactionOptions = {},
): Promise<CompactionResult> {
  const isDryRun = options.dryRun ?? false;
  const orders = isDryRun
    ? { finished: 0, left: 0 }
    : await finishOrders(world, schema, bounds.foldPatienceMs);
  const made = await withFresh(() => compactOnce(world, desk, schema, options));
  const deletedObjects = await deleteUnnamed(world, isDryRun);
  return { ...made, orders: orders.finished, ordersLeft: orders.left, deletedObjects };
}

type Made = Omit<CompactionResult, 'orders' | 'ordersLeft' | 'deletedObjects'>;

async function compactOnce(
  world: World,
  desk: Desk,
  schema: Schema,
  options: CompactionOptions,
): Promise<Made> {
  const { manifest } = await readManifest(world);
  checkSchema(manifest, schema);
  const id = newBaseId(world, manifest);
  const { version } = manifest;
  const segments = manifest.segments.length;
  const isDue = segments > 0 || isPurgeDue(manifest) || (options.force === true && manifest.base !== null);
  if (!isDue) return { kind: 'nothing-new', version, ...nothing };
  const { counts, bursts } = await readCapped(world, schema, manifest);
  const measured = { ...nothing, version, segments, ...measure(counts) };
  if (options.dryRun) return { kind: 'dry-run', ...measured };
  const rebuilt = await rebuild(world, desk, schema, manifest, counts, {
    id,
    renames: manifest.renames,
    bursts,
    fitModel: options.fitModel ?? fitFindings,
  });
  return {
    kind: rebuilt.isCommitted ? 'compacted' : 'lost-race',
    ...measured,
    version: rebuilt.version,
    baseBytes: rebuilt.baseBytes,
    tableBytes: rebuilt.tableBytes,
    ...findingsOf(rebuilt.made),
  };
}

const nothing = {
  messages: 0,
  columns: 0,
  cells: 0,
  segments: 0,
  baseBytes: 0,
  tableBytes: 0,
  fit: null,
  tokens: { counted: 0, held: 0 },
  bursts: { groups: 0, uncounted: 0 },
  contradictions: [],
  drift: [],
};

function measure(counts: CountsView): Pick<Made, 'messages' | 'columns' | 'cells'> {
  return {
    messages: counts.messages.reduce((sum, c) => sum + c, 0),
    columns: counts.columns.length,
    cells: cellCount(counts),
  };
}

function findingsOf({
  table,
  byQueue,
  contradictions,
}: MadeTable): Pick<Made, 'fit' | 'tokens' | 'bursts' | 'contradictions' | 'drift'> {
  const { messages, logLoss } = table.fit;
  const drift = findDrift(byQueue, bounds.driftRecentEpochs).filter((d) => d.logFactor > 0);
  return {
    fit: { messages, logLoss },
    tokens: {
      counted: table.vocabulary.reduce((sum, tokens) => sum + tokens, 0),
      held: table.counts.regions.reduce((sum, r) => sum + r.tokens.length, 0),
    },
    bursts: { groups: table.bursts.groups.length, uncounted: excessOf(table.bursts) },
    contradictions: contradictions.slice(0, bounds.findingsListedMax),
    drift: drift.slice(0, bounds.findingsListedMax).map(({ tokens: _, ...changed }): ChangedQueue => changed),
  };
}
