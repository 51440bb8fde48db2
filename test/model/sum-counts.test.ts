import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { seal } from '../../src/model/bytes.ts';
import { decodeCounts, encodeCounts } from '../../src/model/codec-counts.ts';
import type { Counts, CountsView, Entry } from '../../src/model/counts.ts';
import { diffCounts } from '../../src/model/difference.ts';
import { findDrift } from '../../src/model/drift.ts';
import { openCounts } from '../../src/model/encoded.ts';
import { defaultFit } from '../../src/model/fit.ts';
import { fitFindings } from '../../src/model/fit-table.ts';
import { emptyCounts, foldEntries, mergeCounts } from '../../src/model/fold.ts';
import { serve } from '../../src/model/served-table.ts';
import { sumCounts } from '../../src/model/sum-counts.ts';
import { createTally } from '../../src/model/tally.ts';
import { column, confirmations, schema, undone } from './examples.ts';

const empty = emptyCounts(schema);
const hex = (bytes: Uint8Array) => Buffer.from(bytes).toString('hex');
const opened = (counts: Counts) => openCounts(encodeCounts(counts), schema, 'base');
/** What an act gives, or the message of what it throws. */
const outcome = (act: () => Uint8Array): string => {
  try {
    return hex(act());
  } catch (error) {
    return (error as Error).message;
  }
};

describe('counts added up in bytes', () => {
  test('are, byte for byte, those added up in memory, whichever of the parts are encoded', () => {
    fc.assert(
      fc.property(confirmations, confirmations, confirmations, (x, y, z) => {
        const [a, b, c] = [x, y, z].map((entries) => foldEntries(empty, entries));
        const expected = hex(encodeCounts(mergeCounts(mergeCounts(a, b), c)));
        const sum = (...parts: CountsView[]) =>
          hex(
            sumCounts(
              schema,
              parts.map((counts) => ({ counts, sign: 1 })),
              'sum',
            ).bytes,
          );
        expect(sum(a, b, c)).toBe(expected);
        expect(sum(opened(c), opened(a), b)).toBe(expected);
      }),
    );
  });

  test('without a part of them are what the others give', () => {
    fc.assert(
      fc.property(confirmations, confirmations, (x, y) => {
        const [kept, taken] = [foldEntries(empty, x), foldEntries(empty, y)];
        const both = opened(mergeCounts(kept, taken));
        const left = sumCounts(
          schema,
          [
            { counts: both, sign: 1 },
            { counts: opened(taken), sign: -1 },
          ],
          'sum',
        );
        expect(hex(left.bytes)).toBe(hex(encodeCounts(kept)));
        // The view that comes with the bytes is the one that reading them gives.
        expect(left).toEqual(openCounts(left.bytes, schema, 'sum'));
      }),
    );
  });

  test('a tally of corrections is what folding them gives, and undoing them brings the base back', () => {
    fc.assert(
      fc.property(confirmations, confirmations, column, (x, y, right) => {
        const base = foldEntries(empty, x);
        const corrections = x.map((e): Entry => ({ ...e, minus: e.plus, plus: right }));
        const entries = [...corrections, ...y];
        const tally = createTally(schema);
        for (const entry of entries) tally.add([entry]);
        const sum = tally.sum(opened(base), 'sum');
        expect(hex(sum.bytes)).toBe(hex(encodeCounts(foldEntries(base, entries))));
        const back = createTally(schema);
        back.add(entries.map(undone));
        expect(hex(back.sum(sum, 'sum').bytes)).toBe(hex(encodeCounts(base)));
      }),
    );
  });

  test('a tally of more entries than a batch holds, over several levels, is what folding them gives', () => {
    const entryOf = (i: number): Entry => ({
      features: {
        schema: schema.id,
        slots: [2, i % 3],
        regions: [Float64Array.of(i % 50), Float64Array.of(100 + (i % 700)), new Float64Array(0)],
      },
      said: null,
      minus: i % 5 === 4 ? { queue: 'billing', epoch: 2900 + ((i - 1) % 7) } : null,
      plus: i % 5 === 4 ? null : { queue: i % 5 === 3 ? 'billing' : 'leaks', epoch: 2900 + (i % 7) },
    });
    // Each fifth takes out what the one before put in: those of its features.
    const entries = Array.from({ length: 80_000 }, (_, i) =>
      i % 5 === 4 ? { ...entryOf(i), features: entryOf(i - 1).features } : entryOf(i),
    );
    const tally = createTally(schema);
    tally.add(entries);
    const { messages, bytes } = tally.sum(null, 'sum');
    // 80,000 · (4 - 1) / 5
    expect(messages.reduce((sum, c) => sum + c, 0)).toBe(48_000);
    expect(hex(bytes)).toBe(hex(encodeCounts(foldEntries(empty, entries))));
  });

  test('nothing added up is the empty table', () => {
    expect(hex(createTally(schema).sum(null, 'sum').bytes)).toBe(hex(encodeCounts(empty)));
  });

  test('what was never put in is refused as folding refuses it', () => {
    fc.assert(
      fc.property(confirmations, confirmations, (x, y) => {
        const base = foldEntries(empty, x);
        const taken = y.slice(0, 3).map(undone);
        const tally = createTally(schema);
        tally.add(taken);
        const folded = outcome(() => encodeCounts(foldEntries(base, taken)));
        const summed = outcome(() => tally.sum(opened(base), 'sum').bytes);
        if (/^counts-/.test(folded)) expect(summed).toMatch(/^counts-(negative|broken) at /);
        else expect(summed).toBe(folded);
      }),
    );
    const entry: Entry = {
      features: {
        schema: schema.id,
        slots: [2, 2],
        regions: [Float64Array.of(7), Float64Array.of(3), new Float64Array(0)],
      },
      said: null,
      minus: null,
      plus: { queue: 'billing', epoch: 2910 },
    };
    const other = {
      ...entry,
      features: { ...entry.features, regions: [Float64Array.of(7), Float64Array.of(6), new Float64Array(0)] },
    };
    const without = (taken: Entry, base = [entry]) => {
      const tally = createTally(schema);
      tally.add([undone(taken)]);
      return () => tally.sum(opened(foldEntries(empty, base)), 'sum');
    };
    expect(without(other, [entry, entry])).toThrow(
      'counts-negative at region word, token 0000000006: expected a count of at least 0, got -1',
    );
    expect(without({ ...entry, plus: { queue: 'leaks', epoch: 2910 } })).toThrow(
      'counts-negative at messages',
    );
    const fewer = {
      ...entry.features,
      regions: [Float64Array.of(7), new Float64Array(0), new Float64Array(0)],
    };
    expect(without({ ...entry, features: fewer })).toThrow('counts-broken at column billing@2910');
  });
});

describe('counts read from bytes', () => {
  test('give the same table, fit, drift and differences as in memory', () => {
    fc.assert(
      fc.property(confirmations, confirmations, fc.constantFrom(null, 3, 30), (x, y, halfLifeDays) => {
        const [counts, other] = [foldEntries(empty, x), foldEntries(empty, y)];
        const fit = {
          ...defaultFit(schema),
          hold: { seenMin: { word: 2, pair: 1 }, relevanceMin: 0.1, sparesNew: true },
        };
        expect(serve(opened(counts), fit, { halfLifeDays })).toEqual(serve(counts, fit, { halfLifeDays }));
        const sample = x.map(({ features, plus }) => ({
          features,
          queue: plus?.queue ?? '',
          epoch: plus?.epoch ?? 0,
        }));
        expect(fitFindings(opened(counts), sample, fit, { halfLifeDays })).toEqual(
          fitFindings(counts, sample, fit, { halfLifeDays }),
        );
        expect(findDrift(opened(counts), 2)).toEqual(findDrift(counts, 2));
        expect(diffCounts(opened(counts), opened(other), 100)).toEqual(diffCounts(counts, other, 100));
      }),
      { numRuns: 30 },
    );
  });

  test('are refused when their cells, behind a right check sum, are none, as reading them whole refuses them', () => {
    fc.assert(
      fc.property(confirmations, fc.nat(), fc.nat(255), (x, at, value) => {
        const payload = encodeCounts(foldEntries(empty, x)).slice(16, -4);
        payload[at % payload.length] = value;
        const sealed = seal('counts', schema.id, payload);
        const whole = outcome(() => encodeCounts(decodeCounts(sealed, schema, 'base')));
        const streamed = outcome(
          () => sumCounts(schema, [{ counts: openCounts(sealed, schema, 'base'), sign: 1 }], 'base').bytes,
        );
        // Of several faults either may name another first.
        const isRefusal = /^(bytes|counts|identity)-broken at base/;
        if (isRefusal.test(whole)) expect(streamed).toMatch(isRefusal);
        else expect(streamed).toBe(whole);
      }),
      { numRuns: 500 },
    );
  });
});
