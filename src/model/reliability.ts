import type { Reliability } from './fit.ts';
import { bandMiddleLogOdds, bandOfLogOdds, recordBands } from './record.ts';
import { logBetaBinomial } from './special.ts';

/** Confirmed statements of one band. */
export interface BandCounts {
  readonly hits: number;
  readonly misses: number;
}

/** What the record holds since `since`, by band. A band in which messages were marked at random for a person's look is judged
 *  by those alone: the rest are the ones that people happened to check. */
export function countBands(record: Float64Array, since: readonly number[]): BandCounts[] {
  return Array.from({ length: recordBands }, (_, b) => {
    // Confirmations from before may have been taken back meanwhile: not below nothing.
    const [hits, misses, auditHits, auditMisses] = [0, 1, 2, 3].map((i) =>
      Math.max(0, record[4 * b + i] - (since[4 * b + i] ?? 0)),
    );
    return auditHits + auditMisses > 0 ? { hits: auditHits, misses: auditMisses } : { hits, misses };
  });
}

/** Draws' worth of belief that a band comes true at the rate said: a true rate within a few points of the middle of its band
 *  is no bias; and of the belief that it may come true at any other rate. */
const soundDraws = 100;
const biasedDraws = 2;
/** Odds of 20 to 1 against the record being sound: strong evidence in the words of Kass and Raftery, JASA 90 (1995). */
const logFactorMin = Math.log(20);
/** Draws' worth of what was said in a corrected rate. */
const priorDraws = 20;

/** log Bayes factor of "the bands come true at rates of their own" against "they come true as said": Beta-binomial evidence of
 *  both, in closed form. */
export function biasEvidence(bands: readonly BandCounts[]): number {
  return bands.reduce((sum, { hits, misses }, b) => {
    const said = middle(b);
    const evidence = (draws: number) =>
      logBetaBinomial(hits, hits + misses, draws * said, draws * (1 - said));
    return sum + evidence(biasedDraws) - evidence(soundDraws);
  }, 0);
}

/** The correction after the record's news. What was said since the last one was said with it, so that a further bias comes on
 *  top of it; with no further bias it stays, and its record goes on. */
export function learnReliability(record: Float64Array, last: Reliability): Reliability {
  const bands = countBands(record, last.since);
  if (biasEvidence(bands) < logFactorMin) return last;
  const rates = bands.map(
    ({ hits, misses }, b) => (priorDraws * middle(b) + hits) / (priorDraws + hits + misses),
  );
  const weights = bands.map(({ hits, misses }) => priorDraws + hits + misses);
  const residual = isotonic(rates, weights).map((rate) => Math.log(rate) - Math.log1p(-rate));
  const before = last.logOdds ?? residual.map((_, b) => bandMiddleLogOdds(b));
  return { logOdds: before.map((x) => interpolate(residual, x)), since: [...record] };
}

/** Non-decreasing values nearest to `values` in weighted squares, by pooling neighbours that are out of order.
 *  Source: Barlow, Bartholomew, Bremner, Brunk, Statistical inference under order restrictions (1972), section 1.2. */
export function isotonic(values: readonly number[], weights: readonly number[]): number[] {
  const pools: { value: number; weight: number; length: number }[] = [];
  values.forEach((value, i) => {
    let pool = { value, weight: weights[i], length: 1 };
    while (pools.length > 0 && pools[pools.length - 1].value > pool.value) {
      const left = pools.pop() as typeof pool;
      const weight = left.weight + pool.weight;
      pool = {
        value: (left.value * left.weight + pool.value * pool.weight) / weight,
        weight,
        length: left.length + pool.length,
      };
    }
    pools.push(pool);
  });
  return pools.flatMap(({ value, length }) => new Array<number>(length).fill(value));
}

/** Log odds to which statements at these log odds came; unchanged where nothing was corrected. */
export function correctedLogOdds({ logOdds }: Reliability, said: number): number {
  return logOdds === null ? said : interpolate(logOdds, said);
}

/** Between the bands' middles linear in the log odds; beyond the outermost shifted as they are. */
function interpolate(logOdds: readonly number[], x: number): number {
  const at = Math.min(
    recordBands - 2,
    Math.max(0, bandOfLogOdds(x - (bandMiddleLogOdds(1) - bandMiddleLogOdds(0)) / 2)),
  );
  const [from, to] = [bandMiddleLogOdds(at), bandMiddleLogOdds(at + 1)];
  if (x <= from) return logOdds[at] + x - from;
  if (x >= to) return logOdds[at + 1] + x - to;
  return logOdds[at] + ((x - from) / (to - from)) * (logOdds[at + 1] - logOdds[at]);
}

function middle(band: number): number {
  return 1 / (1 + Math.exp(-bandMiddleLogOdds(band)));
}
