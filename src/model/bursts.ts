import { createHash } from 'node:crypto';
import { bounds } from '../bounds.ts';
import type { Features, Schema } from '../features/schema.ts';
import type { Column, Counts, Entry } from './counts.ts';
import { emptyCounts, foldEntries, isSameColumn, nameOf } from './fold.ts';

/** Messages that hardly differ, confirmed under one queue in one week: somebody's burst, or an alert that repeats. */
export interface BurstGroup {
  readonly column: Column;
  /** Tokens of the first of them; [regions]. */
  readonly regions: readonly Float64Array[];
  /** How many of them count. */
  readonly counted: number;
}

/** What stands in the base and not in the table that routers load: of each burst all but the first `burstCountedMax`. */
export interface Bursts {
  /** Those that have reached the cap and may go on. */
  readonly groups: readonly BurstGroup[];
  /** Exactly what the messages beyond the cap put into the base, but for the record of what was said of them, which stays. */
  readonly excess: Counts;
  /** These messages by what they hold and where they stand, with how often; so that one that is taken out of the base is taken
   *  out of the excess, to the last bit. */
  readonly members: ReadonlyMap<string, number>;
}

export function noBursts(schema: Schema): Bursts {
  return { groups: [], excess: emptyCounts(schema), members: new Map() };
}

/** Messages beyond the cap. */
export function excessOf({ members }: Bursts): number {
  return [...members.values()].reduce((sum, n) => sum + n, 0);
}

/** Takes entries in their order and tells what of each counts for routing. */
export interface BurstGuard {
  /** The entry without the side that does not count: what stands beyond the cap is neither put in nor taken out. */
  admit(entry: Entry): Entry;
  /** The bursts after what was admitted. */
  bursts(): Bursts;
}

interface OpenGroup {
  readonly column: Column;
  readonly regions: readonly Float64Array[];
  readonly keys: readonly number[];
  counted: number;
}

/** Duplicates are found by their sets of tokens: candidates share the first or last tokens of one of the two largest regions
 *  (hashes: a sample of the set that is the same for all; Broder, On the resemblance and containment of documents, 1997), and hold at least
 *  `burstLikenessMin` of all tokens in common. Messages of fewer than `burstTokensMin` tokens are alike by nature and all
 *  count. Depends on the order of the entries, as the base never does. */
export function createBurstGuard(before: Bursts): BurstGuard {
  const members = new Map(before.members);
  const open = new Set<OpenGroup>();
  const byKey = new Map<number, OpenGroup[]>();
  const keyed = [...before.excess.schema.regions.entries()]
    .sort(([, a], [, b]) => b.tokensMax - a.tokensMax)
    .slice(0, 2)
    .map(([g]) => g);
  let excess = before.excess;
  let waiting: Entry[] = [];

  const close = (group: OpenGroup) => {
    open.delete(group);
    for (const key of group.keys) {
      const left = (byKey.get(key) ?? []).filter((g) => g !== group);
      if (left.length === 0) byKey.delete(key);
      else byKey.set(key, left);
    }
  };
  const start = (column: Column, regions: readonly Float64Array[], counted: number) => {
    const group = { column, regions, keys: keysOf(keyed, regions), counted };
    open.add(group);
    for (const key of group.keys) {
      const held = byKey.get(key);
      if (held === undefined) byKey.set(key, [group]);
      else if (held.push(group) > keptPerKey) held.shift();
    }
    if (open.size <= bounds.burstGroupsMax) return;
    // The oldest that has not come to the cap; a burst is not spread over so many others.
    for (const old of open)
      if (old.counted < bounds.burstCountedMax || open.size > 2 * bounds.burstGroupsMax) return close(old);
  };
  const find = (column: Column, { regions }: Features): OpenGroup | null => {
    for (const key of keysOf(keyed, regions))
      for (const group of byKey.get(key) ?? [])
        if (isSameColumn(group.column, column) && likeness(group.regions, regions) >= bounds.burstLikenessMin)
          return group;
    return null;
  };
  const count = (entry: Entry) => {
    waiting.push(entry);
    if (waiting.length < bounds.foldEntriesMax) return;
    excess = foldEntries(excess, waiting);
    waiting = [];
  };
  const takeOut = (entry: Entry, column: Column): boolean => {
    const key = memberKey(entry.features, column);
    const standing = members.get(key) ?? 0;
    if (standing > 0) {
      if (standing === 1) members.delete(key);
      else members.set(key, standing - 1);
      count({ ...entry, said: null, plus: null });
      return false;
    }
    const group = find(column, entry.features);
    // What a burst began with is not kept once it is taken out: it may have been erased.
    if (group !== null && likeness(group.regions, entry.features.regions) === 1) close(group);
    else if (group !== null) group.counted = Math.max(0, group.counted - 1);
    return true;
  };
  const putIn = (entry: Entry, column: Column): boolean => {
    if (sizeOf(entry.features.regions) < bounds.burstTokensMin) return true;
    const group = find(column, entry.features);
    if (group === null) {
      start(column, entry.features.regions, 1);
      return true;
    }
    const key = memberKey(entry.features, column);
    const isRoom = members.size < bounds.burstMembersMax || members.has(key);
    if (group.counted < bounds.burstCountedMax || !isRoom) {
      group.counted++;
      return true;
    }
    members.set(key, (members.get(key) ?? 0) + 1);
    count({ ...entry, said: null, minus: null });
    return false;
  };
  for (const { column, regions, counted } of before.groups) start(column, regions, counted);

  return {
    admit(entry) {
      const isTaken = entry.minus !== null && takeOut(entry, entry.minus);
      const isPut = entry.plus !== null && putIn(entry, entry.plus);
      if (isTaken === (entry.minus !== null) && isPut === (entry.plus !== null)) return entry;
      return { ...entry, minus: isTaken ? entry.minus : null, plus: isPut ? entry.plus : null };
    },
    bursts() {
      excess = foldEntries(excess, waiting);
      waiting = [];
      const full = [...open].filter((g) => g.counted >= bounds.burstCountedMax);
      const newest = full.reduce((epoch, g) => Math.max(epoch, g.column.epoch), 0);
      const groups = full
        .filter((g) => g.column.epoch >= newest - 1)
        .slice(-bounds.burstGroupsKeptMax)
        .map(({ column, regions, counted }): BurstGroup => ({ column, regions, counted }));
      return { groups, excess, members };
    },
  };
}

/** Groups looked at under one key. */
const keptPerKey = 8;

/** Of each region that has so many, its three first tokens and its three last, in one number: what shares it by chance is told
 *  apart by its likeness. */
function keysOf(keyed: readonly number[], regions: readonly Float64Array[]): number[] {
  const keys: number[] = [];
  for (const g of keyed) {
    const { length } = regions[g];
    if (length < 3) continue;
    for (const at of [0, length - 3]) {
      const [a, b, c] = [regions[g][at], regions[g][at + 1], regions[g][at + 2]];
      keys.push((a * 31 + b * 7 + c) * 2 + (at === 0 ? 0 : 1));
    }
  }
  return keys;
}

/** Tokens in common over tokens in all: Jaccard's coefficient. */
function likeness(a: readonly Float64Array[], b: readonly Float64Array[]): number {
  let common = 0;
  a.forEach((left, g) => {
    const right = b[g];
    for (let i = 0, j = 0; i < left.length && j < right.length; ) {
      if (left[i] === right[j]) {
        common++;
        i++;
        j++;
      } else if (left[i] < right[j]) i++;
      else j++;
    }
  });
  return common / Math.max(1, sizeOf(a) + sizeOf(b) - common);
}

function sizeOf(regions: readonly Float64Array[]): number {
  return regions.reduce((sum, tokens) => sum + tokens.length, 0);
}

/** What a message holds, and where it stands: 64 bits of the SHA-256 of slots and tokens, with the column. */
export function memberKey({ slots, regions }: Features, column: Column): string {
  const hash = createHash('sha256').update(Uint32Array.from([...slots, ...regions.map((t) => t.length)]));
  for (const tokens of regions) hash.update(tokens);
  return `${hash.digest('hex').slice(0, 16)} ${nameOf(column)}`;
}
