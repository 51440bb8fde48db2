import { TallypostError } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { keys } from '../store/keys.ts';
import { isId, noId, timeOf } from './ids.ts';

/** A batch of entries that is in the counts. */
export interface SegmentRef {
  readonly id: string;
  /** The version that brought it in. */
  readonly version: number;
}

/** What the counts consist of: the one object that changes, and only by compare-and-set. */
export interface Manifest {
  readonly format: 1;
  /** Grows by one with each commit, so that no two states have equal bytes. */
  readonly version: number;
  /** Latest clock of all that committed. */
  readonly atMs: number;
  /** Schema of everything counted; empty before the first commit. */
  readonly schema: string;
  /** Counts of all absorbed segments; null: none. */
  readonly base: string | null;
  /** `base` as routers load it. Null exactly when `base` is. */
  readonly table: string | null;
  /** Names the object that lists the ids of all segments ever absorbed; null: none. */
  readonly absorbed: string | null;
  /** In the counts beside the base, in the order of landing. */
  readonly segments: readonly SegmentRef[];
  /** Segments that can no longer land; others took their messages over. */
  readonly voided: readonly string[];
  /** No id that sorts before this one can land any more; unnamed objects before it are deleted. */
  readonly floor: string;
  /** Segments that had landed and were taken back by a restore; what histories say of them is void. */
  readonly rolledBack: readonly string[];
  readonly restores: readonly Restore[];
  /** Queues that were renamed, merged or retired, and what each became. Counts keep the names that were confirmed. */
  readonly renames: Renames;
  /** The version of the last change to anything but `segments` and `voided`. */
  readonly shapedAtVersion: number;
  /** The version that last took an erased message out; what was before it cannot be restored. */
  readonly erasedAtVersion: number;
  /** Objects older than the base that stood at this version are being deleted, since they may hold what was erased until then. */
  readonly purgedAtVersion: number;
  /** Versions below it cannot be restored: their objects are being deleted. */
  readonly oldestVersion: number;
}

/** What became of a queue. A renamed queue's name is used up; a merged or retired one's may be opened again. */
export interface Renamed {
  readonly to: string;
  readonly kind: 'renamed' | 'merged' | 'retired';
}

export type Renames = Readonly<Record<string, Renamed>>;

export interface Restore {
  readonly id: string;
  readonly version: number;
  readonly to: number;
}

export const emptyManifest: Manifest = {
  format: 1,
  version: 0,
  atMs: 0,
  schema: '',
  base: null,
  table: null,
  absorbed: null,
  segments: [],
  voided: [],
  floor: noId,
  rolledBack: [],
  restores: [],
  renames: {},
  shapedAtVersion: 0,
  erasedAtVersion: 0,
  purgedAtVersion: 0,
  oldestVersion: 0,
};

export function encodeManifest(manifest: Manifest): Uint8Array {
  return new TextEncoder().encode(`${JSON.stringify(manifest)}\n`);
}

const isNameOrNull = (v: unknown) => v === null || isId(v);
const isVersion = (v: unknown) => Number.isSafeInteger(v) && (v as number) >= 0;
const isListOf = (v: unknown, is: (item: never) => boolean) =>
  Array.isArray(v) && v.every((i) => is(i as never));
const memberChecks: Record<keyof Manifest, (v: unknown) => boolean> = {
  format: (v) => v === 1,
  version: isVersion,
  atMs: isVersion,
  schema: (v) => typeof v === 'string',
  base: isNameOrNull,
  table: isNameOrNull,
  absorbed: isNameOrNull,
  segments: (v) => isListOf(v, (s: SegmentRef) => isId(s?.id) && isVersion(s.version)),
  voided: (v) => isListOf(v, isId),
  floor: (v) => typeof v === 'string',
  rolledBack: (v) => isListOf(v, isId),
  restores: (v) => isListOf(v, (r: Restore) => isId(r?.id) && isVersion(r.version) && isVersion(r.to)),
  renames: (v) =>
    v !== null &&
    typeof v === 'object' &&
    Object.values(v).every((q) => typeof (q as Renamed)?.to === 'string'),
  shapedAtVersion: isVersion,
  erasedAtVersion: isVersion,
  purgedAtVersion: isVersion,
  oldestVersion: isVersion,
};

/** Throws TallypostError `object-damaged` for anything that this program cannot have written. */
export function decodeManifest(bytes: Uint8Array, place: string): Manifest {
  let value: Record<string, unknown>;
  try {
    value = JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(bytes));
  } catch (cause) {
    throw new TallypostError(
      { code: 'object-damaged', place, expected: 'JSON', got: `${bytes.length} other bytes` },
      cause,
    );
  }
  for (const [member, isRight] of Object.entries(memberChecks)) {
    if (value === null || typeof value !== 'object' || !isRight(value[member]))
      throw new TallypostError({
        code: 'object-damaged',
        place: `${place}#/${member}`,
        expected: 'a member as this version writes it',
        got: value?.[member] === undefined ? 'nothing' : 'something else',
      });
  }
  return value as unknown as Manifest;
}

/** The next state: `change` applied, the version one higher, the clock never back. */
export function successor(before: Manifest, nowMs: number, change: Partial<Manifest>): Manifest {
  return {
    ...before,
    ...change,
    version: before.version + 1,
    atMs: Math.max(before.atMs, Math.floor(nowMs)),
  };
}

/** Named by the manifest; absorbed ones are not. */
export function isNamed(manifest: Manifest, segment: string): boolean {
  return manifest.segments.some((s) => s.id === segment);
}

/** Can never land: another process took its messages over, or it is older than the floor. Ask only for what has not landed. */
export function isVoid(manifest: Manifest, segment: string): boolean {
  return segment < manifest.floor || manifest.voided.includes(segment);
}

/** Entries that were worked out before a restore may subtract what the restore took back. */
export function isOutdated(manifest: Manifest, readAtVersion: number): boolean {
  return manifest.restores.some((r) => r.version > readAtVersion);
}

export function withSegment(
  before: Manifest,
  nowMs: number,
  id: string,
  schema: string,
  erases: boolean,
): Manifest {
  const version = before.version + 1;
  return successor(before, nowMs, {
    schema,
    segments: [...before.segments, { id, version }],
    ...(erases ? { erasedAtVersion: version } : {}),
  });
}

export function withVoided(before: Manifest, nowMs: number, ids: readonly string[]): Manifest {
  return successor(before, nowMs, { voided: [...before.voided, ...ids] });
}

/** What each successor must satisfy, checked before every compare-and-set: the first rule broken, or null.
 *  `gone`: segments that this change absorbs or rolls back; `back`: those in the base that it lists again; none for any
 *  other change. */
export function brokenRule(
  before: Manifest,
  after: Manifest,
  gone: ReadonlySet<string>,
  back: ReadonlySet<string>,
): string | null {
  const ids = after.segments.map((s) => s.id);
  const named = new Set(ids);
  const old = new Set(before.segments.map((s) => s.id));
  const rules: [string, boolean][] = [
    ['version grows by one', after.version === before.version + 1],
    ['the clock never goes back', after.atMs >= before.atMs],
    ['the floor never sinks', after.floor >= before.floor],
    ['no segment is named twice', named.size === ids.length],
    [
      'no segment leaves the list unless absorbed or rolled back',
      [...old].every((id) => named.has(id) || gone.has(id)),
    ],
    ['no void segment lands', ids.every((id) => old.has(id) || back.has(id) || !isVoid(before, id))],
    ['a segment is void or named, never both', after.voided.every((id) => !named.has(id))],
    [
      'a void segment is forgotten only below the floor',
      before.voided.every((id) => id < after.floor || after.voided.includes(id)),
    ],
    ['a table stands with its base', (after.base === null) === (after.table === null)],
    [
      'one schema until the base is replaced',
      before.schema === '' || after.schema === before.schema || after.base !== before.base,
    ],
    [
      'landing versions ascend',
      after.segments.every((s, i) => i === 0 || after.segments[i - 1].version <= s.version),
    ],
    ['no landing is from the future', after.segments.every((s) => s.version <= after.version)],
    ['the oldest version never sinks', after.oldestVersion >= before.oldestVersion],
  ];
  return rules.find(([, holds]) => !holds)?.[0] ?? null;
}

/** Age of a segment that has not landed, by the clocks of its writer and of this process. */
export function ageMs(segment: string, nowMs: number): number {
  return nowMs - timeOf(segment);
}

/** Throws TallypostError `schema-mismatch` when everything counted so far is of another schema. */
export function checkSchema(manifest: Manifest, schema: Schema): void {
  if (manifest.schema === '' || manifest.schema === schema.id) return;
  throw new TallypostError({
    code: 'schema-mismatch',
    place: keys.manifest,
    expected: `schema ${schema.id} of the desk's file`,
    got: `schema ${manifest.schema}; count again with the new one`,
  });
}

/** Something was erased since the last compaction that deleted all that may hold it. */
export function isPurgeDue(manifest: Manifest): boolean {
  return manifest.erasedAtVersion > manifest.purgedAtVersion;
}
