import { bounds } from '../bounds.ts';
import { createHits, type Hits, kindOf } from './hits.ts';
import type { Scorer } from './scorer.ts';
import { locate, readRow, type ScorerRegion } from './scorer-region.ts';
import { partOf, sumsOfToken } from './sums.ts';
import { rowIn } from './token-index.ts';
import { tokenRatios } from './view.ts';

/** What each token of a region adds to the log posterior before length scaling: all readings and parts at once, times their
 *  exponents. Computed when a token is first met and remembered; tokens of one kind (seen once or twice, in the same queues)
 *  share theirs. Scoring is then one addition a known token and queue. */
export interface TokenScores {
  /** Row to slot of `values`, 0 where there is none yet; [rows]. */
  readonly slotOf: Int32Array;
  /** [slots * queues]; slot 0 is work space. */
  values: Float64Array;
  slots: number;
  readonly kinds: Map<number, number>;
  readonly hits: Hits;
}

export function createTokenScores(region: ScorerRegion, queues: number): TokenScores {
  return {
    slotOf: new Int32Array(region.rows),
    values: new Float64Array(256 * queues),
    slots: 1,
    kinds: new Map(),
    hits: createHits(queues),
  };
}

/** Adds what the present tokens contribute to `sum` [queues], before length scaling; answers how many of them the table knows,
 *  those included that it knows to say nothing. */
export function addTokens(scorer: Scorer, g: number, present: Float64Array, sum: Float64Array): number {
  const queues = sum.length;
  const region = scorer.regions[g];
  const scores = scorer.tokenScores[g];
  const from = new Int32Array(present.length);
  let known = 0;
  let remembered = 0;
  for (const token of present) {
    const row = locate(region, token);
    if (row < 0) {
      if (rowIn(region.pruned, token) >= 0) known++;
      continue;
    }
    known++;
    const slot = slotOfRow(scorer, g, row);
    if (slot === 0) for (let k = 0; k < queues; k++) sum[k] += scores.values[k];
    else from[remembered++] = slot * queues;
  }
  // Four tokens at a time: half the time of one by one, since the sum is read and written a quarter as often.
  const { values } = scores;
  let at = 0;
  for (; at + 4 <= remembered; at += 4) {
    const [a, b, c, d] = [from[at], from[at + 1], from[at + 2], from[at + 3]];
    for (let k = 0; k < queues; k++) sum[k] += values[a + k] + values[b + k] + values[c + k] + values[d + k];
  }
  for (; at < remembered; at++) for (let k = 0; k < queues; k++) sum[k] += values[from[at] + k];
  return known;
}

/** Slot of a row's values. The work space is good until the next call. */
function slotOfRow(scorer: Scorer, g: number, row: number): number {
  const scores = scorer.tokenScores[g];
  const known = scores.slotOf[row];
  if (known !== 0) return known;
  const region = scorer.regions[g];
  readRow(region, row, null, scores.hits);
  const kind = kindOf(scores.hits, scorer.queues.length);
  const alike = scores.kinds.get(kind);
  if (alike !== undefined) {
    scores.slotOf[row] = alike;
    return alike;
  }
  const slot = takeSlot(scores, scorer.queues.length);
  fillSlot(
    scorer,
    g,
    row,
    scores.values.subarray(slot * scorer.queues.length, (slot + 1) * scorer.queues.length),
  );
  if (slot !== 0) scores.slotOf[row] = slot;
  if (slot !== 0 && kind >= 0) scores.kinds.set(kind, slot);
  return slot;
}

/** A new slot, or the work space when there is room for no more. */
function takeSlot(scores: TokenScores, queues: number): number {
  if ((scores.slots + 1) * queues > bounds.rememberedScoresMax) return 0;
  if ((scores.slots + 1) * queues > scores.values.length) {
    const grown = new Float64Array(scores.values.length * 2);
    grown.set(scores.values);
    scores.values = grown;
  }
  return scores.slots++;
}

function fillSlot(scorer: Scorer, g: number, row: number, values: Float64Array): void {
  values.fill(0);
  for (const { view, blocks } of scorer.readings[g]) {
    const sums = sumsOfToken(tokenRatios(scorer.regions[g], view, row));
    for (const { part, exponents } of blocks) {
      const score = partOf(sums, part);
      for (let k = 0; k < values.length; k++) values[k] += exponents[k] * score[k];
    }
  }
}
