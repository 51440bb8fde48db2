import betaln from '@stdlib/math-base-special-betaln';

/** log of the evidence of k hits in n draws under a Beta(a, b) prior of their rate, the order of draws known:
 *  B(a + k, b + n - k) / B(a, b), nats. k and n real, 0 ≤ k ≤ n.
 *  Source: Murphy, Machine Learning (2012), section 3.3. */
export function logBetaBinomial(k: number, n: number, a: number, b: number): number {
  return betaln(a + k, b + n - k) - betaln(a, b);
}

/** logBetaBinomial(k, n, a, b) - logBetaBinomial(0, n, a, b), which for whole k is the log of
 *  Π_{i<k} (a + i)/(b + n - 1 - i): no gamma function for the small counts that nearly all cells hold. */
export function logHits(k: number, n: number, a: number, b: number): number {
  if (k <= 32 && Number.isInteger(k)) {
    let hits = 1;
    let misses = 1;
    for (let i = 0; i < k; i++) {
      hits *= a + i;
      misses *= b + n - 1 - i;
    }
    return Math.log(hits / misses);
  }
  return logGamma(a + k) - logGamma(a) - logGammaDrop(b + n, k);
}

/** log Γ(z) - log Γ(z - a) for 0 ≤ a < z, without the loss of digits of subtracting two large values: Stirling's series of
 *  both, its leading terms combined. `logZ` saves a logarithm where z is used again. Error below 1e-13 of the terms.
 *  Source: Abramowitz and Stegun, Handbook of Mathematical Functions, 6.1.40. */
export function logGammaDrop(z: number, a: number, logZ: number = Math.log(z)): number {
  if (z - a < stirlingFrom) return logGamma(z) - logGamma(z - a);
  return a * (logZ - 1) - (z - a - 0.5) * Math.log1p(-a / z) + stirlingTail(z) - stirlingTail(z - a);
}

/** log Γ(z) for z > 0: Stirling's series from z = 12 on, below it reached by Γ(z) = Γ(z + n)/(z (z + 1) … (z + n - 1)).
 *  Agrees with the library's to 1e-13 (tested) and takes a fifth of its time, which was a sixth of a fit's. */
export function logGamma(z: number): number {
  let at = z;
  let rising = 1;
  while (at < stirlingFrom) rising *= at++;
  return (at - 0.5) * Math.log(at) - at + halfLogTwoPi + stirlingTail(at) - Math.log(rising);
}

const stirlingFrom = 12;
const halfLogTwoPi = 0.5 * Math.log(2 * Math.PI);

/** log Γ(z) - ((z - ½) log z - z + ½ log 2π) to five terms: below 1e-14 from z = 12. */
function stirlingTail(z: number): number {
  const y = 1 / (z * z);
  return (1 / 12 - y * (1 / 360 - y * (1 / 1260 - y * (1 / 1680 - y / 1188)))) / z;
}
