import { TallypostError } from '../errors.ts';
import type { Column, Said } from '../model/counts.ts';
import { epochAt } from '../model/fold.ts';
import { isVoid, type Manifest } from './manifest.ts';

/** A confirmation on record. */
export interface Recorded {
  readonly queue: string;
  readonly by: string;
  readonly at: string;
  /** When this segment has landed, the confirmation is accounted for: placed, or outranked by one that is. */
  readonly segment: string;
  /** The segment, or the restore, with which it was taken back. */
  readonly undone?: string;
}

/** Where the message's counts went, once `segment` lands. `queue` null: out of the table. */
export interface Placement {
  readonly queue: string | null;
  readonly by: string;
  readonly at: string;
  readonly segment: string;
}

/** All that is known of one message, changed only by compare-and-set. Every placement but the last has landed. */
export interface History {
  readonly format: 1;
  readonly message: string;
  /** Grows by one with each write, so that no two states have equal bytes. */
  readonly rev: number;
  /** By schema, base 64 (see the model's codec). The message is in a table only if it has features of the table's schema. */
  readonly features: Readonly<Record<string, string>>;
  readonly said: Said | null;
  readonly confirmations: readonly Recorded[];
  readonly placements: readonly Placement[];
  /** An erasure is under way: nothing is accepted any more. */
  readonly isErasing: boolean;
}

/** What stays of an erased message: nothing of its content, so that late confirmations are refused. */
export interface Tombstone {
  readonly format: 1;
  readonly rev: number;
  readonly erasedAt: string;
}

export type Stored = History | Tombstone;

export function isTombstone(stored: Stored): stored is Tombstone {
  return 'erasedAt' in stored;
}

export function encodeHistory(stored: Stored): Uint8Array {
  return new TextEncoder().encode(`${JSON.stringify(stored)}\n`);
}

/** Throws TallypostError `object-damaged`. */
export function decodeHistory(bytes: Uint8Array, place: string): Stored {
  let value: Record<string, unknown> | null = null;
  try {
    value = JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(bytes));
  } catch {
    // Not JSON: reported below with the rest.
  }
  const isText = (v: unknown) => typeof v === 'string';
  const isDated = (v: unknown) => isText(v) && Number.isFinite(Date.parse(v as string));
  const isStep = (s: Record<string, unknown>) =>
    s !== null && (s.queue === null || isText(s.queue)) && isText(s.by) && isDated(s.at) && isText(s.segment);
  const isFormed =
    value !== null && typeof value === 'object' && value.format === 1 && Number.isSafeInteger(value.rev);
  const isStub = isFormed && isDated(value?.erasedAt);
  const isWhole =
    isFormed &&
    isText(value?.message) &&
    value?.features !== null &&
    typeof value?.features === 'object' &&
    Object.values(value.features).every(isText) &&
    typeof value?.isErasing === 'boolean' &&
    Array.isArray(value.confirmations) &&
    value.confirmations.every((c) => isStep(c) && c.queue !== null) &&
    Array.isArray(value.placements) &&
    value.placements.every(isStep);
  if (!isStub && !isWhole)
    throw new TallypostError({
      code: 'object-damaged',
      place,
      expected: 'a history as this version writes it',
      got: `${bytes.length} other bytes`,
    });
  return value as unknown as Stored;
}

/** The newest confirmation stands; of the same time the one by the name that sorts last, so that order of delivery never matters. */
export function outranks(
  a: { readonly at: string; readonly by: string; readonly queue: string | null },
  b: { readonly at: string; readonly by: string; readonly queue: string | null },
): boolean {
  const byTime = Date.parse(a.at) - Date.parse(b.at);
  if (byTime !== 0) return byTime > 0;
  if (a.by !== b.by) return a.by > b.by;
  return (a.queue ?? '') > (b.queue ?? '');
}

export function isSame(a: Omit<Recorded, 'segment'>, b: Omit<Recorded, 'segment'>): boolean {
  return a.queue === b.queue && a.by === b.by && Date.parse(a.at) === Date.parse(b.at);
}

/** The confirmation that the counts must stand under; null when none is left. */
export function standing(confirmations: readonly Recorded[]): Recorded | null {
  let best: Recorded | null = null;
  for (const c of confirmations) if (c.undone === undefined && (best === null || outranks(c, best))) best = c;
  return best;
}

export function columnOf(step: { readonly queue: string | null; readonly at: string } | null): Column | null {
  return step === null || step.queue === null
    ? null
    : { queue: step.queue, epoch: epochAt(Date.parse(step.at)) };
}

/** A history as one manifest reads it. */
export interface Settled {
  readonly confirmations: readonly Recorded[];
  /** Landed, in order. */
  readonly landed: readonly Placement[];
  /** Not known to have landed, and not void: it may still land. */
  readonly open: Placement | null;
  /** Segments that this history named in vain. */
  readonly inVain: ReadonlySet<string>;
  /** Differs from what is stored. */
  readonly isChanged: boolean;
}

const nothingSettled: Settled = {
  confirmations: [],
  landed: [],
  open: null,
  inVain: new Set(),
  isChanged: false,
};

/** Reads a history by a manifest: what a restore took back is taken back, what is void is left out.
 *  `own`: the caller's uncommitted segment, which counts as void. `hasAbsorbed`: whether a segment is in the base; null: not
 *  known, and then nothing is known to be void either, since what was absorbed may lie below the floor. */
export function settle(
  stored: Stored | null,
  manifest: Manifest,
  hasAbsorbed: ((segment: string) => boolean) | null,
  own: string | null,
): Settled {
  if (stored === null || isTombstone(stored)) return nothingSettled;
  const dead = new Set(manifest.rolledBack);
  const restore = manifest.restores.at(-1)?.id ?? '';
  const confirmations = stored.confirmations.map((c): Recorded => {
    const { undone, ...kept } = c;
    if (dead.has(c.segment)) return { ...kept, undone: restore };
    return undone === undefined || dead.has(undone) ? kept : c;
  });
  const landed: Placement[] = [];
  const inVain = new Set<string>();
  let open: Placement | null = null;
  for (const placement of stored.placements) {
    const isLast = placement === stored.placements.at(-1);
    if (dead.has(placement.segment)) continue;
    const { segment } = placement;
    if (!isLast || isLanded(manifest, hasAbsorbed, segment)) landed.push(placement);
    else if (segment === own || (hasAbsorbed !== null && isVoid(manifest, segment))) inVain.add(segment);
    else open = placement;
  }
  const isChanged =
    landed.length + (open ? 1 : 0) !== stored.placements.length ||
    confirmations.some((c, i) => c.undone !== stored.confirmations[i].undone);
  return { confirmations, landed, open, inVain, isChanged };
}

export function isLanded(
  manifest: Manifest,
  hasAbsorbed: ((segment: string) => boolean) | null,
  segment: string,
): boolean {
  return manifest.segments.some((s) => s.id === segment) || (hasAbsorbed?.(segment) ?? false);
}

/** Where the message stands in the counts of one manifest, whatever happened since. */
export function columnAsOf(
  history: History,
  manifest: Manifest,
  hasAbsorbed: (segment: string) => boolean,
): Column | null {
  const dead = new Set(manifest.rolledBack);
  const last = history.placements.findLast(
    ({ segment }) => !dead.has(segment) && isLanded(manifest, hasAbsorbed, segment),
  );
  return columnOf(last ?? null);
}

/** The only segment of a history that may not have landed. */
export function lastSegmentOf(stored: Stored | null): string | null {
  return stored === null || isTombstone(stored) ? null : (stored.placements.at(-1)?.segment ?? null);
}
