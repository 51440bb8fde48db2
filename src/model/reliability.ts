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

/** Neighbouring bands that are tested together: log odds -3 to 0, 0 to 3, 3 to 6 and above, that is posteriors below 0.5, 0.95,
 *  0.9975 and above. Single bands would need many hundreds of confirmations to show a bias that they share. */
const groupBands = 4;

/** Draws' worth of belief that a group comes true at the rate said: a rate within a few points is no bias. */
const soundDraws = 300;
/** Odds of 20 to 1 against the record being sound: strong evidence in the words of Kass and Raftery, JASA 90 (1995). */
const logFactorMin = Math.log(20);
/** Draws' worth of what was said in a corrected rate. */
const priorDraws = 20;

/** log Bayes factor, by group of bands, of "they come true at some rate" against "they come true as said": Beta-binomial evidence
 *  of both, in closed form, with Jeffreys's prior of the rate and one around what was said. [groups]. */
export function biasEvidence(bands: readonly BandCounts[]): number[] {
  return Array.from({ length: recordBands / groupBands }, (_, g) => {
    let [hits, draws, said] = [0, 0, 0];
    for (let b = g * groupBands; b < (g + 1) * groupBands; b++) {
      hits += bands[b].hits;
      draws += bands[b].hits + bands[b].misses;
      said += (bands[b].hits + bands[b].misses) * middle(b);
    }
    if (draws === 0) return 0;
    const rate = said / draws;
    const sound = logBetaBinomial(hits, draws, soundDraws * rate, soundDraws * (1 - rate));
    return logBetaBinomial(hits, draws, 0.5, 0.5) - sound;
  });
}

/** The correction after the record's news. Bands of a group that shows a bias are corrected to what came true, shrunk to what was
 *  said; what was said since the last correction was said with it, so that a further bias comes on top of it. Groups without
 *  a bias stay as they are, and their record goes on. */
export function learnReliability(record: Float64Array, last: Reliability): Reliability {
  const bands = countBands(record, last.since);
  const isBiased = biasEvidence(bands).map((evidence) => evidence > logFactorMin);
  if (!isBiased.includes(true)) return last;
  const drawsOf = (b: number) => (isBiased[Math.floor(b / groupBands)] ? bands[b].hits + bands[b].misses : 0);
  const rates = bands.map(({ hits }, b) =>
    drawsOf(b) === 0 ? middle(b) : (priorDraws * middle(b) + hits) / (priorDraws + drawsOf(b)),
  );
  const residual = isotonic(
    rates,
    bands.map((_, b) => priorDraws + drawsOf(b)),
  ).map(logOddsOf);
  const before = last.logOdds ?? residual.map((_, b) => bandMiddleLogOdds(b));
  return {
    ...last,
    logOdds: rising(before.map((x) => interpolate(residual, x))),
    since: [...record].map((n, i) => (isBiased[Math.floor(i / 4 / groupBands)] ? n : (last.since[i] ?? 0))),
  };
}

/** The correction beside exponents that were just fitted to `messages`. What was said under an empty desk's exponents tells nothing
 *  of fitted ones, and of a fit to half as many messages little: the record begins anew with the first fit, then whenever the
 *  fitted messages have doubled, a correction learned meanwhile staying in force. A record that goes on is learned from. */
export function renewReliability(record: Float64Array, last: Reliability, messages: number): Reliability {
  if (last.fitted === undefined) return { logOdds: null, since: [...record], fitted: messages };
  if (messages >= 2 * last.fitted) return { ...last, since: [...record], fitted: messages };
  return learnReliability(record, last);
}

/** At least a little higher from band to band: of two messages the surer one stays the surer one where bands were pooled. */
function rising(logOdds: readonly number[]): number[] {
  let floor = -Infinity;
  return logOdds.map((x) => {
    const risen = Math.max(x, floor);
    floor = risen + riseMin;
    return risen;
  });
}

/** Log odds a band: over all bands less than a fifth of a band's width. */
const riseMin = 0.01;

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

function logOddsOf(rate: number): number {
  return Math.log(rate) - Math.log1p(-rate);
}
