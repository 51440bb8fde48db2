import gammaln from '@stdlib/math-base-special-gammaln';
import { pooledShare } from './closed-scores.ts';
import type { Counts } from './counts.ts';

/** log evidence of counts drawn from a Dirichlet-multinomial over `values` values, the order of draws known:
 *  log Γ(Na)/Γ(Na + n) Π_v Γ(a_v + n_v)/Γ(a_v) with a_v = N a m_v, nats; `base` m is even when it is not given. Zero counts
 *  need not be listed.
 *  Source: Minka, Estimating a Dirichlet distribution (2000), section 3. */
export function logDirichletEvidence(
  counts: ArrayLike<number>,
  values: number,
  a: number,
  base: ArrayLike<number> | null = null,
): number {
  let total = 0;
  let log = 0;
  for (let v = 0; v < counts.length; v++) {
    if (counts[v] === 0) continue;
    total += counts[v];
    const own = base === null ? a : values * a * base[v];
    log += gammaln(own + counts[v]) - gammaln(own);
  }
  return log + gammaln(values * a) - gammaln(values * a + total);
}

/** Where the evidence is flat, any value does; beyond these ends a prior no longer acts as one. */
const least = 0.01;
const most = 100;
/** Queues of one size would give any α; a queue that just opened must not be taken for one as busy as the others. */
const alphaMax = 10;

/** The pseudo-count that maximises the summed evidence of several draws from symmetric Dirichlet-multinomials over the same
 *  values, between 0.01 and 100, by golden-section search of its logarithm: 30 evaluations to four digits. (Minka's fixed
 *  point has the same solution, see the test, but creeps where the evidence is flat.) 1 where there are no counts. */
export function fitPseudoCount(
  draws: readonly ArrayLike<number>[],
  values: number,
  base: ArrayLike<number> | null = null,
): number {
  if (draws.every((counts) => Array.prototype.every.call(counts, (n) => n === 0))) return 1;
  const evidence = (logA: number) =>
    draws.reduce((sum, counts) => sum + logDirichletEvidence(counts, values, Math.exp(logA), base), 0);
  const golden = (Math.sqrt(5) - 1) / 2;
  let low = Math.log(least);
  let high = Math.log(most);
  let left = high - golden * (high - low);
  let right = low + golden * (high - low);
  let [atLeft, atRight] = [evidence(left), evidence(right)];
  while (high - low > 1e-5) {
    if (atLeft >= atRight) {
      [high, right, atRight] = [right, left, atLeft];
      left = high - golden * (high - low);
      atLeft = evidence(left);
    } else {
      [low, left, atLeft] = [left, right, atRight];
      right = low + golden * (high - low);
      atRight = evidence(right);
    }
  }
  return Math.exp((low + high) / 2);
}

/** Pseudo-counts of queues and of each slot's values about the values' shares, chosen by the evidence of the counts by queue. */
export function fitPriors(projected: Pick<Counts, 'schema' | 'columns' | 'messages' | 'slots'>): {
  readonly alpha: number;
  readonly beta: Readonly<Record<string, number>>;
} {
  const columns = projected.columns.length;
  const alpha = columns < 2 ? 1 : Math.min(alphaMax, fitPseudoCount([projected.messages], columns));
  const beta = projected.schema.slots.map(({ id, values }, j) => {
    const draws = Array.from({ length: columns }, (_, k) =>
      Float64Array.from(values, (_, v) => projected.slots[j][v * columns + k]),
    );
    const base = values.map((_, v) =>
      pooledShare(
        draws.map((counts) => counts[v]),
        projected.messages,
        values.length,
      ),
    );
    return [id, rounded(fitPseudoCount(draws, values.length, base))] as const;
  });
  return { alpha: rounded(alpha), beta: Object.fromEntries(beta) };
}

function rounded(x: number): number {
  return Math.round(x * 1e4) / 1e4;
}
