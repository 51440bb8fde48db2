import type { Features } from '../features/schema.ts';
import { tokenHex } from '../features/schema.ts';
import { priorScore, slotScore } from './closed-scores.ts';
import { type Block, exponentOf, type Reliability } from './fit.ts';
import { schemaMismatch } from './fold.ts';
import type { EvidencePart, Posterior } from './posterior.ts';
import { correctedLogOdds } from './reliability.ts';
import { lengthScale } from './score.ts';
import type { Scorer, ScorerReading } from './scorer.ts';
import { locate } from './scorer-region.ts';
import { emptySums, partOf, type ReadingSums, sumsOfToken } from './sums.ts';
import { addTokens } from './token-scores.ts';
import { tokenRatios } from './view.ts';

/** log P(queue | x) = Σ_b w_bk · score_bk + bias_k, normalised over the queues. Never changes the scorer's table.
 *  Throws TallypostError `schema-mismatch`. Cost: O(queues · present known tokens). */
export function posteriorOf(scorer: Scorer, features: Features): Posterior {
  if (features.schema !== scorer.schema.id)
    throw schemaMismatch('features', scorer.schema.id, features.schema);
  const queues = scorer.queues.length;
  const sum = scorer.priorScores.slice();
  features.slots.forEach((value, j) => {
    const scores = scorer.slotScores[j];
    for (let k = 0; k < queues; k++) sum[k] += scores[value * queues + k];
  });
  let tokens = 0;
  let knownTokens = 0;
  // One for all regions: small arrays cost more to make and to give back than to fill.
  const all = new Float64Array(queues);
  features.regions.forEach((present, g) => {
    tokens += present.length;
    all.set(scorer.absentScores[g]);
    knownTokens += addTokens(scorer, g, present, all);
    const scale = lengthScale(present.length);
    for (let k = 0; k < queues; k++) sum[k] += scale * all[k];
  });
  const logProb = normalise(sum);
  const probability = correct(logProb, scorer.fit.reliability);
  return { queues: scorer.queues, logProb, probability, tokens, knownTokens };
}

/** Σ_b w_bk · score_bk + bias_k, the log posterior before normalisation; [queues]. */
export function combine(scorer: Scorer, scores: Float64Array): Float64Array {
  const queues = scorer.queues.length;
  const sum = Float64Array.from(scorer.queues, (queue) => scorer.fit.bias[queue] ?? 0);
  scorer.fit.blocks.forEach((block, b) => {
    for (let k = 0; k < queues; k++) sum[k] += exponentOf(block, scorer.queues[k]) * scores[b * queues + k];
  });
  return sum;
}

/** Subtracts log Σ exp, so that exp sums to 1; the largest is taken out first, so that nothing overflows. */
export function normalise(logs: Float64Array): Float64Array {
  const top = greatest(logs);
  let sum = 0;
  for (let k = 0; k < logs.length; k++) sum += Math.exp(logs[k] - top);
  const whole = top + Math.log(sum);
  return logs.map((x) => x - whole);
}

function greatest(values: Float64Array): number {
  let top = -Infinity;
  for (let k = 0; k < values.length; k++) top = Math.max(top, values[k]);
  return top;
}

/** The posterior made to come true: its largest entry is set to what statements like it came to, by raising the whole to a power,
 *  so that it still sums to 1 and keeps its order; [queues]. */
export function correct(logProb: Float64Array, reliability: Reliability): Float64Array {
  const top = greatest(logProb);
  const said = top - Math.log(-Math.expm1(top));
  if (reliability.logOdds === null || said === Infinity) return logProb.map(Math.exp);
  const power = powerFor(logProb, correctedLogOdds(reliability, said));
  return normalise(logProb.map((x) => x * power)).map(Math.exp);
}

/** The power p, 1e-3 to 1e3, by which the largest entry of a distribution gets these log odds when all is normalised again: the
 *  others' sum over it, Σ exp(p · (log − top)), is then exp(−logOdds). Its logarithm falls with p and bends little: Newton's steps
 *  take some five rounds, and halving the range of log p goes on where they leave it. */
function powerFor(logProb: Float64Array, logOdds: number): number {
  const largest = logProb.indexOf(greatest(logProb));
  let low = 1e-3;
  let high = 1e3;
  let power = 1;
  for (let round = 0; round < 60; round++) {
    let others = 0;
    let slope = 0;
    for (let k = 0; k < logProb.length; k++) {
      if (k === largest) continue;
      const below = logProb[k] - logProb[largest];
      const share = Math.exp(power * below);
      others += share;
      slope += below * share;
    }
    const excess = Math.log(others) + logOdds;
    if (excess > 0) low = power;
    else high = power;
    const step = power - (excess * others) / slope;
    const isInside = step > low && step < high;
    const next = isInside ? step : Math.sqrt(low * high);
    // The error is squared with each of Newton's steps: behind one so small nothing is left of it.
    if (Math.abs(next - power) <= (isInside ? 1e-9 : 1e-14) * power) return next;
    power = next;
  }
  return power;
}

/** The addends of the log posterior before normalisation: prior, slots, tokens by region, and per region the tokens that
 *  are absent. Their sum over parts is combine(blockScores). O(tokens · queues) memory. */
export function explainParts(scorer: Scorer, features: Features): EvidencePart[] {
  const { queues, fit, schema } = scorer;
  const weighed = (block: Block, score: Float64Array, scale = 1) =>
    score.map((x, k) => exponentOf(block, queues[k]) * scale * x);
  const parts: EvidencePart[] = [];
  for (const block of fit.blocks) {
    if (block.kind === 'prior') {
      parts.push({ kind: 'prior', place: '', value: '', score: weighed(block, priorScore(scorer, null)) });
    }
    if (block.kind !== 'slots') continue;
    schema.slots.forEach((slot, j) => {
      if (slot.group !== block.group) return;
      const score = weighed(block, slotScore(scorer, j, features.slots[j], null, block.base));
      parts.push({ kind: 'slot', place: slot.id, value: slot.values[features.slots[j]], score });
    });
  }
  if (Object.keys(fit.bias).length > 0) {
    parts.push({
      kind: 'bias',
      place: '',
      value: '',
      score: Float64Array.from(queues, (q) => fit.bias[q] ?? 0),
    });
  }
  schema.regions.forEach(({ id }, g) => {
    const present = features.regions[g];
    const scale = lengthScale(present.length);
    /** Weighed sum over the readings of what `sumsOf` gives for each. */
    const part = (kind: string, value: string, sumsOf: (reading: ScorerReading) => ReadingSums) => {
      const score = new Float64Array(queues.length);
      for (const reading of scorer.readings[g]) {
        const sums = sumsOf(reading);
        for (const { index, part } of reading.blocks) {
          weighed(fit.blocks[index], partOf(sums, part), scale).forEach((x, k) => {
            score[k] += x;
          });
        }
      }
      parts.push({ kind, place: id, value, score });
    };
    if (scorer.readings[g].some((reading) => reading.countsAbsent)) {
      const none = emptySums(queues.length);
      part('absent', '', ({ view }) => ({ ...none, absent: view.absent ?? none.absent }));
    }
    for (const token of present) {
      const row = locate(scorer.regions[g], token);
      if (row < 0) continue;
      part('token', tokenHex(token), ({ view }) => sumsOfToken(tokenRatios(scorer.regions[g], view, row)));
    }
  });
  return parts;
}
