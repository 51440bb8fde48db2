import { describe, expect, it } from 'vitest';
import { batchOf, busyShare, type Load, machineOfTemplate, ordinaryLoad } from '../../src/cost/load.ts';
import { type CostLine, monthlyCost, totalDollars } from '../../src/cost/monthly-cost.ts';
import { pricesOfUsEast1 } from '../../src/cost/prices.ts';

function monthOf(changes: Partial<Load> = {}, machine = machineOfTemplate): readonly CostLine[] {
  return monthlyCost({ ...ordinaryLoad, messages: 100_000, ...changes }, machine, pricesOfUsEast1);
}
const lineOf = (lines: readonly CostLine[], service: string, what: string): CostLine =>
  lines.find((one) => one.service === service && one.what === what)!;

/** 100,000 messages: 80,000 mails, 20,000 forms, 40,000 confirmations, so 60,000 requests to the intake; 0.0386 messages and
 *  0.0154 confirmations a second, so that a batch holds one: 100,000 route and 40,000 confirm invocations. */
describe('a month of 100,000 messages', () => {
  const lines = monthOf();

  it('pays for received mail by message and by chunk', () => {
    // 80,000 · $100 / 10^6 = $8.00; 60 KB is one chunk: 80,000 · $90 / 10^6 = $7.20.
    expect(lineOf(lines, 'SES', 'mail received').dollars).toBeCloseTo(8.0, 9);
    expect(lineOf(lines, 'SES', 'mail content').dollars).toBeCloseTo(7.2, 9);
    // 600 KB are three chunks of 256 KB.
    expect(lineOf(monthOf({ mailKb: 600 }), 'SES', 'mail content').amount).toBe(240_000);
  });

  it('pays for the requests that the handlers make', () => {
    // Writes: 80,000 mails by SES + 100,000 copies + 20,000 forms + 40,000 · 2 webhooks + 40,000 histories + 40,000 · 2 folds
    // = 400,000; nights 30 · (10 + 960,000 histories / 1000) = 29,100; no recount: 960,000 are more than the 400,000 that a function recounts;
    // reports 30 · (4 + 300,000 kept messages / 1000) = 9,120.
    expect(lineOf(lines, 'S3', 'writes and listings').amount).toBeCloseTo(438_220, 6);
    // Reads: 100,000 · 2 + 100,000 manifests + 40,000 marks + 40,000 · 3 + 40,000 · 3 + 40,000 segments = 620,000;
    // nights 30 · (2,000 + 40,000 / 30) = 100,000; reports 30 · (2 · 5,000 + 1,000) = 330,000.
    expect(lineOf(lines, 'S3', 'reads').amount).toBeCloseTo(1_050_000, 6);
  });

  it('pays for time by memory', () => {
    // (100,000 · 60 + 40,000 · 40 + 140,000 · 60) / 1000 · 1 GB = 16,000; 60,000 · 40 / 1000 · 0.5 GB = 1,200;
    // nights 30 · (30 + 0.96 · 100) · 2 GB = 7,560; reports 30 · 60 · 2 GB = 3,600; together 28,360 GB-s · $0.0000133334
    // = $0.37814.
    expect(lineOf(lines, 'Lambda', 'time').amount).toBeCloseTo(28_360, 6);
    expect(lineOf(lines, 'Lambda', 'time').dollars).toBeCloseTo(0.37814, 5);
  });

  it('pays for what is kept', () => {
    // (80,000 · 60 + 20,000 · 2) KB = 4,840,000 KB · 97 days / 30 = 15,649,333 KB / 1024² = 14.9244 GB.
    expect(lineOf(lines, 'S3', 'raw messages kept').amount).toBeCloseTo(14.9244, 4);
    // 40,000 · 24 months · 12 KB / 1024² = 10.9863 GB.
    expect(lineOf(lines, 'S3', 'histories kept').amount).toBeCloseTo(10.9863, 3);
  });

  it('pays for polling although nothing comes', () => {
    // Two queues, five pollers each, three polls a minute: 2 · 5 · 3 · 60 · 24 · 30 = 1,296,000;
    // 100,000 + 40,000 sent, 2 · 140,000 received and deleted.
    expect(lineOf(lines, 'SQS', 'send, receive, delete').amount).toBe(1_296_000 + 140_000 + 280_000);
  });

  it('pays for each metric by the hours in which it is written', () => {
    // All hours busy: 10 of route + 3 of confirm + (7 + 1) / 24 of the night + 10 queues of 10,000 each.
    expect(lineOf(lines, 'CloudWatch', 'metrics').amount).toBeCloseTo(10 + 3 + 8 / 24 + 10, 4);
  });

  it('adds up', () => {
    expect(totalDollars(lines)).toBeCloseTo(
      lines.map((one) => one.dollars).reduce((a, b) => a + b),
      9,
    );
    expect(totalDollars([])).toBe(0);
  });
});

describe('the recount', () => {
  it('is paid for while it fits into a function’s time', () => {
    // 10,000 · 0.4 · 24 = 96,000 histories; 30/7 · 96,000 = 411,428.6 reads more than without.
    const reads = (recountMax: number) =>
      lineOf(monthOf({ messages: 10_000 }, { ...machineOfTemplate, recountMax }), 'S3', 'reads').amount;
    expect(reads(96_000) - reads(95_999)).toBeCloseTo(411_428.571, 2);
  });
});

describe('traffic', () => {
  it('fills batches, from one to the most', () => {
    expect(batchOf(1_000, 5, 20)).toBe(1);
    // 10^7 / 2,592,000 s = 3.858 a second; 5 s: 19.29.
    expect(batchOf(10_000_000, 5, 50)).toBeCloseTo(19.29, 2);
    expect(batchOf(10_000_000, 5, 10)).toBe(10);
  });

  it('makes hours busy', () => {
    // 720 in 720 hours: an hour is empty with probability e^-1 = 0.3679.
    expect(busyShare(720)).toBeCloseTo(0.6321, 4);
    expect(busyShare(0)).toBe(0);
    expect(busyShare(1e6)).toBeCloseTo(1, 9);
  });
});
