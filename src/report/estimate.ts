import type { Estimate } from './report-data.ts';

const z95 = 1.959964; // 97.5 % quantile of the normal distribution

/** A share with Wilson's 95 % score interval. E. B. Wilson, JASA 22 (1927), p. 209; it behaves also at 0 and at 1. */
export function estimate(hits: number, of: number): Estimate {
  if (of <= 0) return { hits: 0, of: 0, share: null, low: 0, high: 1 };
  const p = hits / of;
  const scale = 1 + z95 ** 2 / of;
  const centre = (p + z95 ** 2 / (2 * of)) / scale;
  const half = (z95 / scale) * Math.sqrt((p * (1 - p)) / of + z95 ** 2 / (4 * of ** 2));
  return { hits, of, share: p, low: Math.max(0, centre - half), high: Math.min(1, centre + half) };
}
