import type { Reading } from './fit.ts';
import type { Hits } from './hits.ts';
import { logBetaBinomial, logGammaDrop, logHits } from './special.ts';

/** What a reading draws from: E, by queue and in all, and the tokens held. With what follows from them alone. */
export interface Exposure {
  readonly reading: Reading;
  /** E_k, draws of queue k; [queues]. */
  readonly draws: Float64Array;
  readonly drawsSum: number;
  /** V, distinct tokens of the region. */
  readonly vocabulary: number;
  /** s_j / (s_j + E_k); [concentrations][queues]. */
  readonly shrink: readonly Float64Array[];
  /** log (s_j + E_k); [concentrations][queues]. */
  readonly logWhole: readonly Float64Array[];
  /** Work space; [concentrations + 1]. */
  readonly weights: Float64Array;
  /** By D: log evidence of no hit in any queue; [concentrations + 1], the pooled model last. */
  readonly unseen: Map<number, Float64Array>;
}

export function exposureOf(reading: Reading, draws: Float64Array, vocabulary: number): Exposure {
  return {
    reading,
    draws,
    drawsSum: draws.reduce((sum, e) => sum + e, 0),
    vocabulary,
    shrink: reading.concentrations.map((s) => draws.map((e) => s / (s + e))),
    logWhole: reading.concentrations.map((s) => draws.map((e) => Math.log(s + e))),
    weights: new Float64Array(reading.concentrations.length + 1),
    unseen: new Map(),
  };
}

/** The exposure without `draws` draws of queue k and without `tokens` tokens that nothing else holds. */
export function exposureWithout(exposure: Exposure, k: number, draws: number, tokens: number): Exposure {
  const less = exposure.draws.slice();
  less[k] = Math.max(0, less[k] - draws);
  return exposureOf(exposure.reading, less, exposure.vocabulary - tokens);
}

/** m_t, the pooled rate of a token held D times: (D + ½)/(T + ½V) of tokens, (D + ½)/(n + 1) of messages. Below 1 also
 *  where the only token ever seen is the only one known. */
export function pooledRate({ reading, drawsSum, vocabulary }: Exposure, seen: number): number {
  const draws = reading.draws === 'tokens' ? drawsSum + 0.5 * vocabulary : drawsSum + 1;
  return Math.min((seen + 0.5) / draws, 1 - 1e-9);
}

/** Posterior weights of the models of one token's rates, given its counts: for each concentration s_j that the rate depends
 *  on the queue, with rates drawn from Beta(s_j·m, s_j·(1-m)); last, that one rate serves all. Equal before the counts.
 *  Shape: [concentrations + 1], sums to 1; the array is the exposure's, good until the next call. Closed form (method of Bayesian model averaging; Dash and Cooper,
 *  JMLR 5, 2004):  w_j ∝ Π_k B(d_k hits of E_k | s_j m, s_j (1-m)). */
export function weighModels(exposure: Exposure, hits: Hits): Float64Array {
  const { concentrations, pooledRate: pooled } = exposure.reading;
  const m = pooledRate(exposure, hits.seen);
  const out = exposure.weights;
  out.set(unseenEvidence(exposure, hits.seen, m));
  const last = concentrations.length;
  let top = -Infinity;
  for (let j = 0; j < last; j++) {
    const a = concentrations[j] * m;
    const b = concentrations[j] * (1 - m);
    for (let h = 0; h < hits.length; h++)
      out[j] += logHits(hits.count[h], exposure.draws[hits.queue[h]], a, b);
    top = Math.max(top, out[j]);
  }
  if (pooled === 'fixed') out[last] += hits.seen * (Math.log(m) - Math.log1p(-m));
  else {
    const s = concentrations[0];
    out[last] += logHits(hits.seen, exposure.drawsSum, s * m, s * (1 - m));
  }
  top = Math.max(top, out[last]);
  let sum = 0;
  for (let j = 0; j <= last; j++) sum += out[j] = Math.exp(out[j] - top);
  for (let j = 0; j <= last; j++) out[j] /= sum;
  return out;
}

/** Depends on a token through D alone, so it is computed once for each D: most tokens share a small one. */
function unseenEvidence(exposure: Exposure, seen: number, m: number): Float64Array {
  const known = exposure.unseen.get(seen);
  if (known) return known;
  const { concentrations, pooledRate: pooled } = exposure.reading;
  const evidence = new Float64Array(concentrations.length + 1);
  // B(a, b + E)/B(a, b) = Γ(b + E)/Γ(b) · Γ(s)/Γ(s + E) with b = s - a: two drops by a, one of them the same for all queues.
  concentrations.forEach((s, j) => {
    const a = s * m;
    const one = logGammaDrop(s, a);
    const logWhole = exposure.logWhole[j];
    for (let k = 0; k < logWhole.length; k++) {
      const e = exposure.draws[k];
      if (e > 0) evidence[j] += one - logGammaDrop(s + e, a, logWhole[k]);
    }
  });
  evidence[concentrations.length] =
    pooled === 'fixed'
      ? exposure.drawsSum * Math.log1p(-m)
      : logBetaBinomial(0, exposure.drawsSum, concentrations[0] * m, concentrations[0] * (1 - m));
  exposure.unseen.set(seen, evidence);
  return evidence;
}

/** p_k / m for one token: its rate in each queue, averaged over the weighed models, against the pooled rate.
 *  Shape: out[queues];  p_k = w_pooled·m + Σ_j w_j·(s_j·m + d_k)/(s_j + E_k). */
export function rateRatios(exposure: Exposure, hits: Hits, out: Float64Array): void {
  const { concentrations } = exposure.reading;
  const weights = weighModels(exposure, hits);
  const queues = exposure.draws.length;
  out.fill(weights[concentrations.length]);
  for (let j = 0; j < concentrations.length; j++) {
    const weight = weights[j];
    const shrink = exposure.shrink[j];
    for (let k = 0; k < queues; k++) out[k] += weight * shrink[k];
  }
  const m = pooledRate(exposure, hits.seen);
  for (let h = 0; h < hits.length; h++) {
    const k = hits.queue[h];
    let rate = 0;
    for (let j = 0; j < concentrations.length; j++)
      rate += weights[j] / (concentrations[j] + exposure.draws[k]);
    out[k] += (rate * hits.count[h]) / m;
  }
}
