import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import type { Schema } from '../features/schema.ts';
import { fitTable } from '../model/fit-table.ts';
import { readManifest } from './commit.ts';
import { deleteUnnamed } from './deletion.ts';
import { finishOrders } from './finish-orders.ts';
import { checkSchema, isPurgeDue, type Manifest } from './manifest.ts';
import { readCounts, withFresh } from './objects.ts';
import { type FitModel, newBaseId, rebuild } from './rebuild.ts';
import type { World } from './world.ts';

export interface CompactionOptions {
  /** Make a new base and fit also when no segment landed since the last one. */
  readonly force?: boolean;
  readonly dryRun?: boolean;
  readonly fitModel?: FitModel;
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
  /** Erasures and undos of crashed processes that were brought to their end. */
  readonly orders: number;
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
  const orders = isDryRun ? 0 : await finishOrders(world, schema, bounds.foldPatienceMs);
  const made = await withFresh(() => compactOnce(world, desk, schema, options));
  const deletedObjects = await deleteUnnamed(world, isDryRun);
  return { ...made, orders, deletedObjects };
}

type Made = Omit<CompactionResult, 'orders' | 'deletedObjects'>;

async function compactOnce(
  world: World,
  desk: Desk,
  schema: Schema,
  options: CompactionOptions,
): Promise<Made> {
  const { manifest } = await readManifest(world);
  checkSchema(manifest, schema);
  const id = newBaseId(world, manifest);
  const segments = manifest.segments.length;
  const isDue = segments > 0 || isPurgeDue(manifest) || (options.force === true && manifest.base !== null);
  if (!isDue) return nothingNew(manifest);
  const counts = await readCounts(world, schema, manifest);
  const measured = {
    version: manifest.version,
    messages: counts.messages.reduce((sum, c) => sum + c, 0),
    columns: counts.columns.length,
    cells: counts.regions.reduce((sum, r) => sum + r.column.length, 0),
    segments,
  };
  if (options.dryRun) return { kind: 'dry-run', ...measured, baseBytes: 0, tableBytes: 0, fit: null };
  const rebuilt = await rebuild(world, desk, schema, manifest, counts, {
    id,
    renames: manifest.renames,
    fitModel: options.fitModel ?? fitTable,
  });
  return {
    kind: rebuilt.isCommitted ? 'compacted' : 'lost-race',
    ...measured,
    version: rebuilt.version,
    baseBytes: rebuilt.baseBytes,
    tableBytes: rebuilt.tableBytes,
    fit: { messages: rebuilt.table.fit.messages, logLoss: rebuilt.table.fit.logLoss },
  };
}

function nothingNew({ version }: Manifest): Made {
  const nothing = { messages: 0, columns: 0, cells: 0, segments: 0, baseBytes: 0, tableBytes: 0, fit: null };
  return { kind: 'nothing-new', version, ...nothing };
}
