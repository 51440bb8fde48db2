import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { correct } from '../../src/model/posterior-of.ts';
import { bandMiddleLogOdds, bandOf, recordBands } from '../../src/model/record.ts';
import {
  biasEvidence,
  countBands,
  isotonic,
  learnReliability,
  renewReliability,
} from '../../src/model/reliability.ts';

const nothing = { logOdds: null, since: [] };
const odds = (logOdds: number) => 1 / (1 + Math.exp(-logOdds));

/** A record of `each` statements in the middle of every band, that came true at `rate(said)`. */
function recordOf(each: number, rate: (said: number) => number, isAudit = false): Float64Array {
  const record = new Float64Array(recordBands * 4);
  for (let b = 0; b < recordBands; b++) {
    const hits = Math.round(each * rate(odds(bandMiddleLogOdds(b))));
    record[4 * b + (isAudit ? 2 : 0)] = hits;
    record[4 * b + (isAudit ? 3 : 1)] = each - hits;
  }
  return record;
}

describe('a record that came true as said', () => {
  test('is no evidence of a bias and corrects nothing', () => {
    for (const each of [0, 10, 300]) {
      const record = recordOf(each, (said) => said);
      for (const evidence of biasEvidence(countBands(record, []))) expect(evidence).toBeLessThanOrEqual(0);
      expect(learnReliability(record, nothing)).toBe(nothing);
    }
  });
});

describe('a record that came true less often than said', () => {
  const record = recordOf(400, (said) => 0.2 + 0.6 * said);
  const learned = learnReliability(record, nothing);

  test('corrects each band to about what came true, shrunk by 20 draws to what was said', () => {
    expect(biasEvidence(countBands(record, []))[2]).toBeGreaterThan(Math.log(20));
    // Band 10 is said at log odds 4.875, a probability of 0.99242: 0.2 + 0.6 · 0.99242 = 0.79545, so 318 of 400 came true;
    // (20 · 0.99242 + 318)/420 = 0.80440, log odds 1.41403.
    expect(learned.logOdds?.[10]).toBeCloseTo(1.41403, 4);
  });

  test('gives posteriors that sum to 1, keep their order and state the corrected top', () => {
    fc.assert(
      fc.property(
        fc.array(fc.double({ min: -30, max: 0, noNaN: true }), { minLength: 2, maxLength: 12 }),
        (logs) => {
          const whole = Math.log(logs.reduce((sum, x) => sum + Math.exp(x), 0));
          const logProb = Float64Array.from(logs, (x) => x - whole);
          const p = correct(logProb, learned);
          expect(Math.abs(p.reduce((a, b) => a + b) - 1)).toBeLessThan(1e-12);
          expect(p.indexOf(Math.max(...p))).toBe(logProb.indexOf(Math.max(...logProb)));
        },
      ),
    );
    const said = odds(bandMiddleLogOdds(10));
    const p = correct(Float64Array.of(Math.log(said), Math.log(1 - said)), learned);
    expect(p[0]).toBeCloseTo(0.8044, 4);
  });

  test('keeps the surer of two messages the surer one', () => {
    // From band 9 on, 0.98 and up, the record says 0.79 to 0.8 throughout.
    learned.logOdds?.forEach((x, b, all) => {
      if (b > 0) expect(x).toBeGreaterThan(all[b - 1]);
    });
  });

  test('counts only what was said since as news: the same record again changes nothing', () => {
    expect(learned.since).toEqual([...record]);
    expect(learnReliability(record, learned)).toBe(learned);
  });

  test('a further bias comes on top', () => {
    const twice = record.map((n, i) => n + recordOf(400, (said) => 0.2 + 0.6 * said)[i]);
    const again = learnReliability(twice, learned);
    // Corrected to 0.8044 (log odds 1.414) before; said at that, 0.2 + 0.6 · 0.8044 = 0.683 came true: log odds 0.77.
    expect(again.logOdds?.[10]).toBeGreaterThan(0.6);
    expect(again.logOdds?.[10]).toBeLessThan(1);
  });
});

test('a band with messages marked at random is judged by those alone', () => {
  const record = recordOf(100, () => 0);
  const audited = recordOf(50, (said) => said, true).map((n, i) => n + record[i]);
  expect(biasEvidence(countBands(record, []))[2]).toBeGreaterThan(100);
  expect(learnReliability(audited, nothing)).toBe(nothing);
});

test('a certain posterior stays certain, one queue is all there is', () => {
  const learned = learnReliability(
    recordOf(400, (said) => 0.6 * said),
    nothing,
  );
  expect([...correct(Float64Array.of(0, -Infinity), learned)]).toEqual([1, 0]);
  expect([...correct(Float64Array.of(0), learned)]).toEqual([1]);
});

test('bands of stated posteriors', () => {
  // log odds of 0.9 are 2.197: (2.197 + 3)/0.75 = 6.93.
  expect([0, 0.04, 0.5, 0.9, 0.9999, 1].map(bandOf)).toEqual([0, 0, 4, 6, 15, 15]);
});

describe('isotonic regression', () => {
  test('by hand', () => {
    // 3 and 1 pool to 2; with weights 1 and 3 to (3 + 3)/4 = 1.5.
    expect(isotonic([3, 1, 4], [1, 1, 1])).toEqual([2, 2, 4]);
    expect(isotonic([3, 1, 4], [1, 3, 1])).toEqual([1.5, 1.5, 4]);
    expect(isotonic([3, 2, 1], [1, 1, 1])).toEqual([2, 2, 2]);
  });

  test('never falls, keeps the weighted mean, leaves what is in order', () => {
    fc.assert(
      fc.property(
        fc.array(fc.tuple(fc.double({ min: 0, max: 1, noNaN: true }), fc.integer({ min: 1, max: 9 })), {
          minLength: 1,
        }),
        (pairs) => {
          const values = pairs.map(([v]) => v);
          const weights = pairs.map(([, w]) => w);
          const fitted = isotonic(values, weights);
          const mean = (xs: readonly number[]) => xs.reduce((sum, x, i) => sum + x * weights[i], 0);
          expect(mean(fitted)).toBeCloseTo(mean(values), 9);
          fitted.forEach((x, i) => {
            expect(i === 0 || x >= fitted[i - 1]).toBe(true);
          });
          const sorted = [...values].sort((a, b) => a - b);
          expect(isotonic(sorted, weights)).toEqual(sorted);
        },
      ),
    );
  });
});

describe('beside exponents just fitted', () => {
  const record = recordOf(400, (said) => 0.2 + 0.6 * said);

  test('what was said before the first fit is no news', () => {
    const first = renewReliability(record, learnReliability(record, nothing), 40);
    expect(first).toEqual({ logOdds: null, since: [...record], fitted: 40 });
    expect(renewReliability(record, first, 50)).toBe(first);
  });

  test('what was said since is, until the fitted messages have doubled', () => {
    const first = { logOdds: null, since: [], fitted: 400 };
    const learned = renewReliability(record, first, 799);
    expect(learned.logOdds?.[10]).toBeCloseTo(1.41403, 4);
    expect(learned.fitted).toBe(400);
    // Doubled: the correction stays, the record begins anew.
    expect(renewReliability(record, first, 800)).toEqual({ logOdds: null, since: [...record], fitted: 800 });
    expect(renewReliability(record, learned, 800)).toEqual({ ...learned, fitted: 800 });
  });
});
