import { describe, expect, it } from 'vitest';
import { encodeCounts } from '../../../src/model/codec-counts.ts';
import { emptyCounts, foldEntries, mergeCounts } from '../../../src/model/fold.ts';
import { createGenerated, entryOf, ordinary } from '../speed/generated.ts';
import { type Costs, demandOf, deskMax, messagesMax, shardsOf, type Traffic } from './capacity.ts';

/** 2,592,000 messages in the 2,592,000 seconds of 30 days: one a second, four at the peak, of which two are confirmed. */
const traffic: Traffic = {
  messagesPerMonth: 2_592_000,
  confirmedShare: 0.5,
  peakFactor: 4,
  historyMonths: 2,
};
const costs: Costs = {
  routeSeconds: 0.05,
  confirmSeconds: 0.03,
  intakeSeconds: 0.02,
  confirmBatch: 100,
  commitSeconds: 0.05,
  commitShare: 0.5,
  compactSeconds: { fixed: 10, perConfirmation: 1e-5 },
  compactMb: { fixed: 100, perConfirmation: 1e-5 },
};

describe('capacity', () => {
  it('adds up what the peak needs of each limit', () => {
    const demand = demandOf(traffic, costs);
    // 4 messages: each received and marked; 2 confirmations: drop, mark and history; 0.02 folds: segment and manifest.
    expect(demand.s3Writes).toBeCloseTo(4 * 2 + 2 * 3 + 0.02 * 2, 9);
    // 4 messages: head, body and the manifest; 2 confirmations: the mark and three of the fold's; 0.02 folds of three.
    expect(demand.s3Reads).toBeCloseTo(4 * 3 + 2 * 4 + 0.02 * 3, 9);
    // 0.02 folds · 0.05 s / 0.5
    expect(demand.commits).toBeCloseTo(0.002, 9);
    // 2,592,000 · 0.5 · 2 = 2,592,000 kept: 10 + 25.92
    expect(demand.compactSeconds).toBeCloseTo(35.92, 9);
    expect(demand.compactMb).toBeCloseTo(125.92, 9);
    // 4 · 0.05 + 2 · 0.05
    expect(demand.concurrency).toBeCloseTo(0.3, 9);
    expect(demand.inFlight).toBeCloseTo(30, 9);
  });

  it('finds the traffic at which a limit is met', () => {
    // 14.04 writes a second at 2,592,000 messages: 3500 / 14.04 · 2,592,000
    expect(messagesMax('s3Writes', traffic, costs)).toBeCloseTo((3500 / 14.04) * 2_592_000, 0);
    // (900 - 10) / 1e-5 = 89 million kept, one for each message a month
    expect(messagesMax('compactSeconds', traffic, costs)).toBeCloseTo(89_000_000, 0);
    expect(messagesMax('compactMb', traffic, costs)).toBeCloseTo(194_800_000, 0);
  });

  it('names what stops a desk first, and splits a larger one', () => {
    expect(deskMax(traffic, costs)).toEqual({
      limit: 'compactSeconds',
      messages: expect.closeTo(89_000_000, 0),
    });
    expect(shardsOf(88_000_000, traffic, costs)).toBe(1);
    expect(shardsOf(100_000_000, traffic, costs)).toBe(2);
    expect(shardsOf(300_000_000, traffic, costs)).toBe(4);
  });

  it('loses nothing by sharding: counts of three shards add to the counts of the whole, byte for byte', () => {
    const generated = createGenerated({ ...ordinary, queues: 5, messages: 60, weeks: 3 });
    const entries = Array.from({ length: 60 }, (_, i) => entryOf(generated, i));
    const fold = (some: typeof entries) => foldEntries(emptyCounts(generated.schema), some);
    const shards = [0, 1, 2].map((shard) => fold(entries.filter((_, i) => i % 3 === shard)));
    const whole = fold(entries);
    expect(whole.messages.reduce((sum, c) => sum + c, 0)).toBe(60);
    expect(encodeCounts(shards.reduce(mergeCounts))).toEqual(encodeCounts(whole));
  });
});
