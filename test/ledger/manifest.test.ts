import { describe, expect, it } from 'vitest';
import { outranks } from '../../src/ledger/history.ts';
import { firstIdAt, isId, newId, timeOf } from '../../src/ledger/ids.ts';
import {
  brokenRule,
  decodeManifest,
  emptyManifest,
  encodeManifest,
  type Manifest,
  withSegment,
  withVoided,
} from '../../src/ledger/manifest.ts';
import { startMs, testWorld } from './fixture.ts';

const [s1, s2, s3] = ['0mm8eww00-aaaaaaaaaaaa', '0mm8eww01-bbbbbbbbbbbb', '0mm8eww02-cccccccccccc'];
const none = new Set<string>();

describe('ids', () => {
  it('sort by time as strings, for millennia', () => {
    const times = [0, 1, startMs, Date.UTC(2100, 0, 1), Date.UTC(5000, 0, 1)];
    const ids = times.map((ms) => `${firstIdAt(ms)}-000000000000`);
    expect([...ids].sort()).toEqual(ids);
    expect(ids.map(timeOf)).toEqual(times);
  });

  it('come after what they must come after, also by a clock that is behind', () => {
    const world = { ...testWorld(), nowMs: () => 1000 };
    const id = newId(world, s2);
    expect(isId(id)).toBe(true);
    expect(id > s2).toBe(true);
    expect(newId(world, '', startMs) > firstIdAt(startMs)).toBe(true);
  });
});

describe('a manifest', () => {
  const one = withSegment(emptyManifest, 5, s2, 'schema', false);

  it('survives its own encoding', () => {
    expect(decodeManifest(encodeManifest(one), 'm')).toEqual(one);
  });

  it.each([
    ['', 'm'],
    ['null', 'm#/format'],
    ['{"format":2}', 'm#/format'],
    [JSON.stringify({ ...one, version: 1.5 }), 'm#/version'],
    [JSON.stringify({ ...one, base: '../x' }), 'm#/base'],
    [JSON.stringify({ ...one, segments: [{ id: s1 }] }), 'm#/segments'],
    [JSON.stringify({ ...one, voided: 'x' }), 'm#/voided'],
  ])('%s is damaged', (text, place) => {
    expect(() => decodeManifest(new TextEncoder().encode(text), 'm')).toThrow(
      expect.objectContaining({ code: 'object-damaged', place }),
    );
  });

  const change = (over: Partial<Manifest>): Manifest => ({ ...one, version: 2, ...over });
  it.each<[string | null, Manifest]>([
    [null, withSegment(one, 6, s3, 'schema', false)],
    [null, withVoided(one, 6, [s3])],
    ['version grows by one', change({ version: 1 })],
    ['version grows by one', change({ version: 3 })],
    ['the clock never goes back', change({ atMs: 4 })],
    ['no segment is named twice', change({ segments: [...one.segments, ...one.segments] })],
    ['no segment leaves the list unless absorbed or rolled back', change({ segments: [] })],
    ['a segment is void or named, never both', change({ voided: [s2] })],
    ['a table stands with its base', change({ base: s3 })],
    ['one schema until the base is replaced', change({ schema: 'other' })],
    ['no landing is from the future', change({ segments: [{ id: s2, version: 9 }] })],
  ])('follows another: %s', (rule, after) => {
    expect(brokenRule(one, after, none, none)).toBe(rule);
  });

  it.each<[string | null, Partial<Manifest>, Partial<Manifest>]>([
    [
      'no void segment lands',
      { voided: [s3] },
      { voided: [], segments: [...one.segments, { id: s3, version: 2 }] },
    ],
    ['no void segment lands', { floor: s3 }, { segments: [...one.segments, { id: s1, version: 2 }] }],
    ['a void segment is forgotten only below the floor', { voided: [s1] }, { voided: [] }],
    [null, { voided: [s1] }, { voided: [], floor: s2 }],
    ['the floor never sinks', { floor: s2 }, { floor: s1 }],
    ['the oldest version never sinks', { oldestVersion: 1 }, { oldestVersion: 0 }],
  ])('%s', (rule, before, after) => {
    const from = { ...one, ...before };
    expect(brokenRule(from, { ...from, version: 2, ...after }, none, none)).toBe(rule);
  });
});

describe('of two confirmations', () => {
  const at = (at: string, by = 'ann', queue = 'billing') => ({ at, by, queue });
  it.each([
    ['the later one', at('2026-03-02T10:00:01Z'), at('2026-03-02T10:00:00Z')],
    [
      'the later one in whatever zone it is written',
      at('2026-03-02T10:30:00+01:00'),
      at('2026-03-02T09:00:00Z'),
    ],
    ['of one time the later name', at('2026-03-02T10:00:00Z', 'bob'), at('2026-03-02T10:00:00.000Z', 'ann')],
    [
      'of one person and time the later queue',
      at('2026-03-02T10:00:00Z', 'ann', 'leaks'),
      at('2026-03-02T10:00:00Z'),
    ],
  ])('%s stands', (_, winner, loser) => {
    expect([outranks(winner, loser), outranks(loser, winner)]).toEqual([true, false]);
  });
});
