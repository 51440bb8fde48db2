import { describe, expect, it } from 'vitest';
import { batchOf, monthlyCost, ordinaryLoad, totalDollars } from '../../src/cost/monthly-cost.ts';
import { pricesOfUsEast1 } from '../../src/cost/prices.ts';

const dollarsOf = (lines: ReturnType<typeof monthlyCost>, service: string, what: string): number =>
  lines.find((one) => one.service === service && one.what === what)!.dollars;

describe('monthly cost', () => {
  const lines = monthlyCost(
    { ...ordinaryLoad, messages: 100_000, routeBatch: 1, confirmBatch: 1 },
    pricesOfUsEast1,
  );

  it('charges received mail by message and by chunk', () => {
    // 100,000 · 0.8 = 80,000 mails; 80,000 · $100 / 10^6 = $8.00; 60 KB is one chunk: 80,000 · $90 / 10^6 = $7.20.
    expect(dollarsOf(lines, 'SES', 'mail received')).toBeCloseTo(8.0, 9);
    expect(dollarsOf(lines, 'SES', 'mail content')).toBeCloseTo(7.2, 9);
  });

  it('charges the writes that the handlers make', () => {
    // 100,000 stored + 100,000 copies + 40,000 · 3 + 40,000 · 2 + 300 = 400,300 writes; · $5 / 10^6 = $2.0015.
    expect(dollarsOf(lines, 'S3', 'writes')).toBeCloseTo(2.0015, 9);
  });

  it('charges time by memory', () => {
    // ((100,000 · 25 + 40,000 · 30 + (100,000 + 40,000 + 60,000) · 60) / 1000) · 0.5 = (2,500 + 1,200 + 12,000) · 0.5 = 7,850;
    // nights 30 · 60 · 2 = 3,600; together 11,450 GB-s · $0.0000133334 = $0.15266743.
    expect(dollarsOf(lines, 'Lambda', 'time')).toBeCloseTo(0.15266743, 8);
  });

  it('adds up', () => {
    expect(totalDollars(lines)).toBeCloseTo(
      lines.map((one) => one.dollars).reduce((a, b) => a + b),
      9,
    );
    expect(totalDollars([])).toBe(0);
  });

  it('fills batches with the traffic, from one to the most', () => {
    expect(batchOf(1_000, 5, 20)).toBe(1);
    // 10^7 / 2,592,000 s = 3.858 a second; 5 s: 19.29.
    expect(batchOf(10_000_000, 5, 50)).toBeCloseTo(19.29, 2);
    expect(batchOf(10_000_000, 5, 10)).toBe(10);
  });
});
