import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import type { Features, Schema } from '../../src/features/schema.ts';
import { createBurstGuard, excessOf, noBursts } from '../../src/model/bursts.ts';
import { encodeCounts } from '../../src/model/codec-counts.ts';
import { decodeTable, encodeTable } from '../../src/model/codec-table.ts';
import type { Entry } from '../../src/model/counts.ts';
import { defaultFit } from '../../src/model/fit.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { serve } from '../../src/model/served-table.ts';
import { sumCounts } from '../../src/model/sum-counts.ts';
import { undone } from './examples.ts';

const schema: Schema = {
  id: '00112233445566ab',
  version: 1,
  slots: [{ id: 'channel', group: 'channel', values: ['missing', 'other', 'mail', 'form'] }],
  regions: [
    { id: 'word', tokensMax: 100 },
    { id: 'pair', tokensMax: 100 },
  ],
};
const empty = emptyCounts(schema);
const hex = (bytes: Uint8Array) => Buffer.from(bytes).toString('hex');

/** 50 words and 50 pairs of a text of its own; the last `changed` words are this message's. */
function featuresOf(text: number, message = 0, changed = 0): Features {
  const words = Array.from({ length: 50 }, (_, i) =>
    i < 50 - changed ? 1000 * text + 7 * i : 10 ** 9 + 1000 * message + i,
  );
  const pairs = Array.from({ length: 50 }, (_, i) => 10 ** 6 * (text + 1) + i);
  return {
    schema: schema.id,
    slots: [2],
    regions: [Float64Array.from(words).sort(), Float64Array.from(pairs)],
  };
}
const confirm = (features: Features, queue = 'billing', epoch = 2900): Entry => ({
  features,
  said: { queue: 'billing', posterior: 0.5, isAudit: false },
  minus: null,
  plus: { queue, epoch },
});
const admitAll = (entries: readonly Entry[], before = noBursts(schema)) => {
  const guard = createBurstGuard(before);
  const counted = entries.map((entry) => guard.admit(entry));
  return { counted, bursts: guard.bursts() };
};
const standing = (entries: readonly Entry[]) => entries.filter((e) => e.plus !== null).length;

describe('a burst of alike messages', () => {
  test('counts up to the cap, a queue and a week, and the rest is its excess, exactly', () => {
    // One word of 50 changed: 99 tokens of 100 in common, 99 / 101 = 0.98 of all.
    const burst = Array.from({ length: 35 }, (_, i) => confirm(featuresOf(1, i, 1)));
    const { counted, bursts } = admitAll(burst);
    expect(standing(counted)).toBe(20);
    expect(excessOf(bursts)).toBe(15);
    expect(bursts.excess.messages[0]).toBe(15);
    expect(bursts.groups).toHaveLength(1);
    const elsewhere = [
      confirm(featuresOf(1, 90, 1), 'leaks'),
      confirm(featuresOf(1, 91, 1), 'billing', 2901),
    ];
    expect(admitAll(elsewhere, bursts).counted).toEqual(elsewhere);
    expect(standing(admitAll([confirm(featuresOf(1, 92, 1))], bursts).counted)).toBe(0);
  });

  test('is none where messages differ more, or are short', () => {
    // 15 of 50 words changed: 85 in common, 85 / 115 = 0.74.
    const differing = Array.from({ length: 35 }, (_, i) => confirm(featuresOf(1, i, 15)));
    expect(standing(admitAll(differing).counted)).toBe(35);
    const brief = featuresOf(1);
    const short = { ...brief, regions: brief.regions.map((tokens) => tokens.slice(0, 19)) };
    expect(standing(admitAll(Array.from({ length: 35 }, () => confirm(short))).counted)).toBe(35);
  });

  test('does not hide among other messages', () => {
    const mixed = Array.from({ length: 60 }, (_, i) => confirm(i % 2 ? featuresOf(1) : featuresOf(100 + i)));
    const { counted } = admitAll(mixed);
    expect(standing(counted.filter((_, i) => i % 2 === 1))).toBe(20);
    expect(standing(counted.filter((_, i) => i % 2 === 0))).toBe(30);
  });

  test('taken back, erased or corrected, leaves the excess as if it had not been', () => {
    const burst = Array.from({ length: 30 }, (_, i) => confirm(featuresOf(1, i, 1)));
    const { bursts } = admitAll(burst);
    const after = admitAll(burst.map(undone), bursts);
    expect(hex(encodeCounts(after.bursts.excess))).toBe(hex(encodeCounts(empty)));
    expect(after.bursts.members.size).toBe(0);
    // What they began with is not kept.
    expect(after.bursts.groups).toEqual([]);
    const moved = burst.map((e): Entry => ({ ...e, minus: e.plus, plus: { queue: 'leaks', epoch: 2900 } }));
    const corrected = admitAll(moved, bursts);
    expect(corrected.bursts.excess.columns).toEqual([{ queue: 'leaks', epoch: 2900 }]);
    expect(excessOf(corrected.bursts)).toBe(10);
  });

  test('is laid over a table as the next compaction will count it: base less excess, cell by cell', () => {
    const step = fc.record({
      text: fc.nat(2),
      message: fc.nat(3),
      undo: fc.boolean(),
      queue: fc.constantFrom('billing', 'leaks'),
    });
    fc.assert(
      fc.property(fc.array(step, { minLength: 40, maxLength: 160 }), fc.nat(160), (steps, cut) => {
        const stands: Entry[] = [];
        const entries = steps.flatMap(({ text, message, undo, queue }): Entry[] => {
          const taken = undo ? stands.pop() : undefined;
          if (taken) return [undone(taken)];
          const entry = confirm(featuresOf(text, message, message > 1 ? 1 : 0), queue);
          stands.push(entry);
          return [entry];
        });
        const first = admitAll(entries.slice(0, cut));
        const second = admitAll(entries.slice(cut), first.bursts);
        const served = foldEntries(
          foldEntries(empty, first.counted),
          second.counted.map((e) => ({ ...e, said: null })),
        );
        const base = foldEntries(empty, entries);
        const less = sumCounts(
          schema,
          [
            { counts: base, sign: 1 },
            { counts: second.bursts.excess, sign: -1 },
          ],
          'less',
        );
        const silent = sumCounts(schema, [{ counts: { ...served, record: base.record }, sign: 1 }], 'served');
        expect(hex(less.bytes)).toBe(hex(silent.bytes));
        expect(excessOf(second.bursts)).toBe(second.bursts.excess.messages.reduce((a, b) => a + b, 0));
      }),
      { numRuns: 60 },
    );
  });

  test('is kept with the table', () => {
    const { bursts } = admitAll(Array.from({ length: 30 }, (_, i) => confirm(featuresOf(1, i % 4, 1))));
    const table = serve(empty, defaultFit(schema), { halfLifeDays: null, bursts });
    expect(table.bursts.groups[0].counted).toBe(bounds.burstCountedMax);
    expect(decodeTable(encodeTable(table), schema, 'table')).toEqual(table);
  });
});
