import digamma from '@stdlib/math-base-special-digamma';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { fitPseudoCount, logDirichletEvidence } from '../../src/model/priors.ts';

describe('evidence of a symmetric Dirichlet-multinomial', () => {
  test('by hand', () => {
    // Uniform over 3 values: counts 2, 1, 0: Γ(3)/Γ(6) · 2! · 1! · 0! = 2/120 · 2 = 1/30.
    expect(logDirichletEvidence([2, 1, 0], 3, 1)).toBeCloseTo(Math.log(1 / 30), 12);
    // Pólya's urn, a = 1/2 of two values, one of each: 1/2 · (1/2)/(1 + 1) = 1/8.
    expect(logDirichletEvidence([1, 1], 2, 0.5)).toBeCloseTo(Math.log(1 / 8), 12);
  });

  test('equals the integral of the likelihood over the prior', () => {
    // Two values, density ∝ x^(a-1) (1-x)^(a-1) with a ≥ 1; Simpson's rule.
    for (const [n1, n2, a] of [
      [3, 5, 1],
      [10, 2, 2.5],
      [0, 7, 4],
    ] as const) {
      const integral = (p: number, q: number) => {
        const steps = 20_000;
        let sum = 0;
        for (let i = 0; i <= steps; i++) {
          const x = i / steps;
          const weight = i === 0 || i === steps ? 1 : i % 2 === 1 ? 4 : 2;
          sum += weight * x ** (a - 1 + p) * (1 - x) ** (a - 1 + q);
        }
        return sum / steps / 3;
      };
      expect(logDirichletEvidence([n1, n2], 2, a)).toBeCloseTo(
        Math.log(integral(n1, n2) / integral(0, 0)),
        7,
      );
    }
  });
});

describe('the pseudo-count of most evidence', () => {
  test('is where the evidence is largest', () => {
    fc.assert(
      fc.property(
        fc.array(fc.array(fc.nat(20), { minLength: 4, maxLength: 4 }), { minLength: 2, maxLength: 6 }),
        (draws) => {
          const best = fitPseudoCount(draws, 4);
          const evidence = (a: number) => draws.reduce((sum, n) => sum + logDirichletEvidence(n, 4, a), 0);
          for (const factor of [0.5, 0.9, 1.1, 2]) {
            const other = Math.min(100, Math.max(0.01, best * factor));
            expect(evidence(best)).toBeGreaterThanOrEqual(evidence(other) - 1e-6 * Math.abs(evidence(other)));
          }
        },
      ),
    );
  });

  test('recovers the one that the counts were drawn with, on average', () => {
    // Counts proportional to the quantiles of Dirichlet(1, 1), the uniform distribution on the segment: 500 draws of 200.
    const draws = Array.from({ length: 500 }, (_, i) => {
      const first = Math.round((200 * (i + 0.5)) / 500);
      return [first, 200 - first];
    });
    expect(fitPseudoCount(draws, 2)).toBeGreaterThan(0.95);
    expect(fitPseudoCount(draws, 2)).toBeLessThan(1.1);
  });

  test("solves Minka's fixed point (section 3, equation 55 for one pseudo-count of all values)", () => {
    const draws = [
      [3, 0, 9, 1],
      [0, 7, 1, 2],
      [4, 4, 0, 0],
      [1, 0, 0, 8],
    ];
    const a = fitPseudoCount(draws, 4);
    let gained = 0;
    let expected = 0;
    for (const counts of draws) {
      const total = counts.reduce((sum, n) => sum + n);
      for (const n of counts) gained += digamma(a + n) - digamma(a);
      expected += 4 * (digamma(4 * a + total) - digamma(4 * a));
    }
    expect(gained / expected).toBeCloseTo(1, 4);
    expect(a).toBeGreaterThan(0.1);
    expect(a).toBeLessThan(2);
  });

  test('stays within its ends where one value takes all, or all draws agree', () => {
    expect(
      fitPseudoCount(
        [
          [50, 0],
          [70, 0],
        ],
        2,
      ),
    ).toBeCloseTo(0.01, 6);
    expect(
      fitPseudoCount(
        [
          [50, 50],
          [700, 700],
        ],
        2,
      ),
    ).toBeCloseTo(100, 2);
    expect(fitPseudoCount([[0, 0]], 2)).toBe(1);
  });
});

test('a base of shares draws each value by its own pseudo-count', () => {
  // Shares 3/4 and 1/4 of 2·1 pseudo-counts: 1.5 and 0.5. Urn of two of the first, one of the second:
  // 1.5/2 · 2.5/3 · 0.5/4 = 5/64.
  expect(logDirichletEvidence([2, 1], 2, 1, [0.75, 0.25])).toBeCloseTo(Math.log(5 / 64), 12);
});
