import { bounds } from '../bounds.ts';
import { createHits, type Hits, kindOf } from './hits.ts';
import type { Scorer } from './scorer.ts';
import { locateAll, readRow, type ScorerRegion } from './scorer-region.ts';
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

/** Work space of a call. */
let rows = new Int32Array(4096);
let from = new Int32Array(rows.length);
/** What was read ahead; nobody asks for it, but reads whose result goes nowhere would not be made. */
const readAhead = new Float64Array(1);

/** Adds what the present tokens contribute to `sum` [queues], before length scaling; answers how many of them the table knows,
 *  those included that it knows to say nothing. */
export function addTokens(scorer: Scorer, g: number, present: Float64Array, sum: Float64Array): number {
  const queues = sum.length;
  const region = scorer.regions[g];
  const scores = scorer.tokenScores[g];
  const { slotOf } = scores;
  if (present.length > rows.length) {
    rows = new Int32Array(present.length);
    from = new Int32Array(present.length);
  }
  locateAll(region, present, rows);
  // Each pass reads what the next one needs, as in finding the rows.
  for (let i = 0; i < present.length; i++) from[i] = rows[i] < 0 ? -1 : slotOf[rows[i]] * queues;
  let ahead = 0;
  for (let i = 0; i < present.length; i++) ahead += from[i] < 0 ? 0 : scores.values[from[i]];
  readAhead[0] = ahead;
  let known = 0;
  let remembered = 0;
  for (let i = 0; i < present.length; i++) {
    let at = from[i];
    if (at < 0) {
      if (rowIn(region.pruned, present[i]) >= 0) known++;
      continue;
    }
    known++;
    if (at === 0) at = slotOfRow(scorer, g, rows[i]) * queues;
    if (at === 0) for (let k = 0; k < queues; k++) sum[k] += scores.values[k];
    else from[remembered++] = at;
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
