import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { checkCounts } from '../../src/model/check-counts.ts';
import { encodeCounts } from '../../src/model/codec-counts.ts';
import type { Counts, Entry } from '../../src/model/counts.ts';
import { diffCounts } from '../../src/model/difference.ts';
import { emptyCounts, epochAt, foldEntries, mergeCounts, renameQueues } from '../../src/model/fold.ts';
import { column, confirmations, queueNames, schema, undone } from './examples.ts';

const empty = emptyCounts(schema);
const bytes = (counts: Counts) => Buffer.from(encodeCounts(counts)).toString('hex');

describe('laws of counting', () => {
  test('a batch gives what one by one gives, and any order the same bytes', () => {
    fc.assert(
      fc.property(
        confirmations.chain((entries) =>
          fc.tuple(fc.constant(entries), fc.shuffledSubarray(entries, { minLength: entries.length })),
        ),
        ([entries, shuffled]) => {
          const batch = bytes(foldEntries(empty, entries));
          expect(bytes(shuffled.reduce((counts, entry) => foldEntries(counts, [entry]), empty))).toBe(batch);
        },
      ),
    );
  });

  test('merging commutes, associates, has the empty table as neutral element, and equals folding both', () => {
    fc.assert(
      fc.property(confirmations, confirmations, confirmations, (x, y, z) => {
        const [a, b, c] = [x, y, z].map((entries) => foldEntries(empty, entries));
        expect(bytes(mergeCounts(a, b))).toBe(bytes(mergeCounts(b, a)));
        expect(bytes(mergeCounts(mergeCounts(a, b), c))).toBe(bytes(mergeCounts(a, mergeCounts(b, c))));
        expect(bytes(mergeCounts(a, empty))).toBe(bytes(a));
        expect(bytes(mergeCounts(a, b))).toBe(bytes(foldEntries(empty, [...x, ...y])));
      }),
    );
  });

  test('unfolding after folding is the identity, down to the empty table', () => {
    fc.assert(
      fc.property(confirmations, confirmations, (kept, taken) => {
        const before = foldEntries(empty, kept);
        const after = foldEntries(foldEntries(before, taken), taken.map(undone));
        expect(bytes(after)).toBe(bytes(before));
        expect(bytes(foldEntries(before, kept.map(undone)))).toBe(bytes(empty));
      }),
    );
  });

  test('a correction equals having confirmed the other queue at once', () => {
    fc.assert(
      fc.property(confirmations, column, (entries, right) => {
        const corrections = entries.map((e): Entry => ({ ...e, minus: e.plus, plus: right }));
        const atOnce = entries.map((e): Entry => ({ ...e, plus: right }));
        expect(bytes(foldEntries(foldEntries(empty, entries), corrections))).toBe(
          bytes(foldEntries(empty, atOnce)),
        );
      }),
    );
  });

  test('every fold passes the check and leaves its argument as it was', () => {
    fc.assert(
      fc.property(confirmations, confirmations, (first, second) => {
        const counts = foldEntries(empty, first);
        const before = bytes(counts);
        checkCounts(foldEntries(counts, second), 'folded');
        expect(bytes(counts)).toBe(before);
      }),
    );
  });

  test('renaming equals having confirmed under the new names; names that meet are merged', () => {
    fc.assert(
      fc.property(confirmations, (entries) => {
        const to = new Map([
          ['billing', 'accounts'],
          ['leaks', 'moving'],
        ]);
        const renamed = entries.map(
          (e): Entry => ({
            ...e,
            said: null,
            plus: e.plus && { ...e.plus, queue: to.get(e.plus.queue) ?? e.plus.queue },
          }),
        );
        const silent = entries.map((e) => ({ ...e, said: null }));
        expect(bytes(renameQueues(foldEntries(empty, silent), to))).toBe(bytes(foldEntries(empty, renamed)));
      }),
    );
  });

  test('two tables differ in no cell exactly when their bytes are equal', () => {
    fc.assert(
      fc.property(confirmations, confirmations, (x, y) => {
        const [a, b] = [foldEntries(empty, x), foldEntries(empty, y)];
        expect(diffCounts(a, b, 100).length === 0).toBe(bytes(a) === bytes(b));
        expect(diffCounts(a, a, 100)).toEqual([]);
      }),
    );
  });
});

describe('an example by hand', () => {
  const features = {
    schema: schema.id,
    slots: [2, 2],
    regions: [Float64Array.of(7), Float64Array.of(3, 5), new Float64Array(0)],
  };
  const confirm = (queue: string, epoch: number): Entry => ({
    features,
    said: { queue: 'billing', posterior: 0.5, isAudit: false },
    minus: null,
    plus: { queue, epoch },
  });
  const counts = foldEntries(empty, [
    confirm('leaks', 2911),
    confirm('billing', 2910),
    confirm('billing', 2910),
  ]);

  test('columns ascend by queue and epoch, and cells count messages', () => {
    expect(counts.columns).toEqual([
      { queue: 'billing', epoch: 2910 },
      { queue: 'leaks', epoch: 2911 },
    ]);
    expect([...counts.messages]).toEqual([2, 1]);
    // channel = mail is value 2 of 4: rows missing, other, mail, form of two columns each.
    expect([...counts.slots[0]]).toEqual([0, 0, 0, 0, 2, 1, 0, 0]);
    expect([...counts.regions[1].tokens]).toEqual([3, 5]);
    expect([...counts.regions[1].count]).toEqual([2, 1, 2, 1]);
    // Exposure of `word`: 2 messages of 2 tokens in billing, 1 of 2 in leaks.
    expect([...counts.regions[1].total]).toEqual([4, 2]);
  });

  test('the record holds two hits and a miss in the band of even odds', () => {
    // log odds of 0.5 are 0; (0 - -3) / 0.75 = band 4, cells 16 to 19.
    expect([...counts.record.subarray(16, 20)]).toEqual([2, 1, 0, 0]);
    expect(counts.record.reduce((a, b) => a + b)).toBe(3);
  });

  test('a difference names the cell without words', () => {
    const other = foldEntries(counts, [confirm('leaks', 2911)]);
    expect(diffCounts(counts, other, 100).map((d) => d.cell)).toContain(
      'region word, token 0000000003, queue leaks, epoch 2911',
    );
    expect(diffCounts(counts, other, 2)).toHaveLength(2);
  });

  test('the epoch of a time is its week since 1970', () => {
    expect(epochAt(0)).toBe(0);
    expect(epochAt(7 * 86_400_000 - 1)).toBe(0);
    // 2026-03-01T10:00:00Z is day 20,513: floor(20513 / 7) = 2930.
    expect(epochAt(Date.UTC(2026, 2, 1, 10))).toBe(2930);
  });

  test('taking out what was never put in is refused, and names the place', () => {
    expect(() => foldEntries(counts, [undone(confirm('moving', 2910))])).toThrow(
      /counts-negative at messages/,
    );
    const stranger = {
      ...features,
      regions: [Float64Array.of(7), Float64Array.of(3, 6), new Float64Array(0)],
    };
    expect(() => foldEntries(counts, [undone({ ...confirm('billing', 2910), features: stranger })])).toThrow(
      'counts-negative at region word, token 0000000006: expected a count of at least 0, got -1',
    );
    expect(() =>
      foldEntries(counts, [
        undone({
          ...confirm('leaks', 2911),
          features: { ...features, regions: [Float64Array.of(7), new Float64Array(0), new Float64Array(0)] },
        }),
      ]),
    ).toThrow('counts-broken at column leaks@2911');
  });

  test('features of another schema are refused', () => {
    const foreign = { ...confirm('leaks', 2911), features: { ...features, schema: 'ffffffffffffffff' } };
    expect(() => foldEntries(counts, [foreign])).toThrow('schema-mismatch at entry');
    expect(() => mergeCounts(counts, emptyCounts({ ...schema, id: 'ffffffffffffffff' }))).toThrow(
      'schema-mismatch',
    );
  });

  test('more entries than fit one pass fold alike', () => {
    const many = Array.from({ length: 9000 }, (_, i) => confirm(queueNames[i % 3], 2000 + (i % 7)));
    const folded = foldEntries(empty, many);
    expect(folded.messages.reduce((a, b) => a + b)).toBe(9000);
    expect(folded.columns).toHaveLength(21);
    expect(bytes(foldEntries(folded, many.map(undone)))).toBe(bytes(empty));
  });
});
