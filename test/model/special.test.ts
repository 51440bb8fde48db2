import gammaln from '@stdlib/math-base-special-gammaln';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { logBetaBinomial, logGamma, logGammaDrop, logHits } from '../../src/model/special.ts';

describe('evidence of hits', () => {
  test('by hand', () => {
    // Uniform prior: B(1 + 2, 1 + 1)/B(1, 1) = 2!·1!/4! = 1/12.
    expect(logBetaBinomial(2, 3, 1, 1)).toBeCloseTo(Math.log(1 / 12), 12);
    // No draws, no evidence.
    expect(logBetaBinomial(0, 0, 0.3, 2)).toBeCloseTo(0, 12);
    // Against no hit in 3 draws, B(1, 4)/B(1, 1) = 1/4: log (1/12)/(1/4) = log 1/3.
    expect(logHits(2, 3, 1, 1)).toBeCloseTo(Math.log(1 / 3), 12);
  });

  test('equals the integral of the likelihood over the prior', () => {
    // Simpson's rule over x = sin²u, which removes the poles of the prior at the ends; a, b ≥ 1/2.
    for (const [k, n, a, b] of [
      [0, 4, 0.5, 3],
      [3, 10, 0.5, 0.5],
      [7, 9, 2, 5.5],
      [1, 40, 1, 99],
    ] as const) {
      const at = (u: number, hits: number, misses: number) =>
        2 * Math.sin(u) ** (2 * (a + hits) - 1) * Math.cos(u) ** (2 * (b + misses) - 1);
      const integral = (hits: number, misses: number) => {
        const steps = 20_000;
        let sum = 0;
        for (let i = 0; i <= steps; i++) {
          const weight = i === 0 || i === steps ? 1 : i % 2 === 1 ? 4 : 2;
          sum += weight * at((i / steps) * (Math.PI / 2), hits, misses);
        }
        return (sum * Math.PI) / 2 / steps / 3;
      };
      expect(logBetaBinomial(k, n, a, b)).toBeCloseTo(Math.log(integral(k, n - k) / integral(0, 0)), 9);
    }
  });

  test('whole counts and others go the same way', () => {
    fc.assert(
      fc.property(fc.nat(16), fc.nat(1000), fc.double({ min: 1e-3, max: 50, noNaN: true }), (k, more, a) => {
        const [n, b] = [k + more, 7.5];
        expect(logHits(k, n, a, b)).toBeCloseTo(logBetaBinomial(k, n, a, b) - logBetaBinomial(0, n, a, b), 8);
        expect(logHits(k + 0.5, n + 1, a, b)).toBeCloseTo(
          logBetaBinomial(k + 0.5, n + 1, a, b) - logBetaBinomial(0, n + 1, a, b),
          8,
        );
      }),
    );
  });
});

test('log gamma agrees with the library', () => {
  fc.assert(
    fc.property(fc.double({ min: 1e-6, max: 1e6, noNaN: true }), (z) => {
      expect(Math.abs(logGamma(z) - gammaln(z))).toBeLessThan(1e-13 * Math.max(1, Math.abs(gammaln(z))));
    }),
    { numRuns: 1000 },
  );
  // Γ(5) = 4! = 24; Γ(1/2) = √π.
  expect(logGamma(5)).toBeCloseTo(Math.log(24), 13);
  expect(logGamma(0.5)).toBeCloseTo(0.5 * Math.log(Math.PI), 13);
});

describe('difference of two log gammas', () => {
  test('equals the difference taken in the open', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1e-3, max: 1e4, noNaN: true }),
        fc.double({ min: 1e-6, max: 0.999, noNaN: true }),
        (z, part) => {
          const a = z * part;
          const open = gammaln(z) - gammaln(z - a);
          expect(Math.abs(logGammaDrop(z, a) - open)).toBeLessThan(
            1e-11 * Math.max(1, Math.abs(gammaln(z)), Math.abs(gammaln(z - a))),
          );
        },
      ),
    );
  });

  test('keeps its digits where the open difference loses them', () => {
    // Γ(z)/Γ(z - 1) = z - 1, so at z = 1e12 + 1 the drop by 1 is log 1e12 = 27.6310211159285...
    expect(logGammaDrop(1e12 + 1, 1)).toBeCloseTo(27.6310211159285, 12);
  });
});
