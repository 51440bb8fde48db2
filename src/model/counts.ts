import type { Features, Schema } from '../features/schema.ts';

/** One column of the table: the confirmed messages of one queue in one epoch. */
export interface Column {
  readonly queue: string;
  /** floor(confirmation time / 7 days), UTC weeks since 1970-01-01. 0 in a table that was projected to queues. */
  readonly epoch: number;
}

export const epochMs = 7 * 24 * 3600 * 1000;

/** Sparse counts of one region. Cells of token i stand at start[i] .. start[i+1], ascending by column. */
export interface RegionCounts {
  /** Ascending, distinct; [tokens]. */
  readonly tokens: Float64Array;
  /** [tokens + 1]. */
  readonly start: Uint32Array;
  /** Column index; [cells]. */
  readonly column: Uint32Array;
  /** Messages of that column holding that token; non-zero; [cells]. */
  readonly count: Float64Array;
  /** Exposure of the share reading, Σ_t d(t), pruned tokens included; [columns]. */
  readonly total: Float64Array;
}

/** Everything learned. Immutable by convention: every operation gives a new value.
 *  Canonical: columns ascending by (queue, epoch), none without messages; no zero cell, no token without a cell. */
export interface Counts {
  readonly schema: Schema;
  readonly columns: readonly Column[];
  /** c, confirmed messages; [columns]. */
  readonly messages: Float64Array;
  /** d; [slots][values * columns], value-major. Σ_v d = c for every slot and column. */
  readonly slots: readonly Float64Array[];
  /** [regions]. */
  readonly regions: readonly RegionCounts[];
  /** What was said against what was confirmed; [bands * 4]: band-major, then (routed or held: hit, miss), (audit: hit, miss). */
  readonly record: Float64Array;
}

/** Counts of one region as they stand in bytes, see codec-counts; `rowsOf` reads them token by token. */
export interface EncodedRegion {
  readonly total: Float64Array;
  /** Tokens and cells held. */
  readonly rows: number;
  readonly cells: number;
  /** Of the region's columns. */
  readonly columns: number;
  readonly bytes: Uint8Array;
  /** Where the tokens begin, and where the cells begin and end. */
  readonly tokensAt: number;
  readonly cellsAt: number;
  readonly endAt: number;
  /** Names the object in errors. */
  readonly place: string;
}

/** Counts that are read token by token, in memory or in bytes: a million confirmations take 2 to 3 bytes a cell in bytes, and
 *  20 in memory. */
export interface CountsView extends Omit<Counts, 'regions'> {
  readonly regions: readonly (RegionCounts | EncodedRegion)[];
}

/** The counts in bytes: canonical, so that equal counts have equal bytes. */
export interface EncodedCounts extends CountsView {
  readonly regions: readonly EncodedRegion[];
  /** Sealed, as `decodeCounts` reads them. */
  readonly bytes: Uint8Array;
}

/** What the router said about a message at routing time, kept for the reliability record. */
export interface Said {
  readonly queue: string;
  /** Stated posterior of that queue, 0 to 1. */
  readonly posterior: number;
  /** Marked at random for a person's look, so that it counts for the unbiased estimate. */
  readonly isAudit: boolean;
}

/** One change to the counts. `minus` is null for a first confirmation, `plus` is null for an erasure or an undo. */
export interface Entry {
  readonly features: Features;
  readonly said: Said | null;
  readonly minus: Column | null;
  readonly plus: Column | null;
}

/** Where two tables differ; `cell` is readable and holds no words, e.g. `region word, token 1f3a…, queue billing`. */
export interface CellDifference {
  readonly cell: string;
  readonly left: number;
  readonly right: number;
}
