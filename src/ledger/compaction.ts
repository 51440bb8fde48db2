import type { Desk } from '../desk/desk.ts';
import type { Schema } from '../features/schema.ts';
import type { World } from './world.ts';

export interface CompactionOptions {
  /** Make a new base and fit also when no segment landed since the last one. */
  readonly force?: boolean;
  readonly dryRun?: boolean;
}

/** JSON-able. */
export interface CompactionResult {
  readonly kind: 'compacted' | 'nothing-new' | 'lost-race';
  readonly version: number;
  readonly messages: number;
  readonly segments: number;
  readonly deletedObjects: number;
}

/** Adds base and segments, fits, checks, writes a new base and served table, commits them, and deletes what is past the horizon. */
export declare function compact(
  world: World,
  desk: Desk,
  schema: Schema,
  options?: CompactionOptions,
): Promise<CompactionResult>;
