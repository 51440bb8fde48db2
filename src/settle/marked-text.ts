import { bounds } from '../bounds.ts';
import type { Balance } from '../explain/balance.ts';
import { type Content, html } from '../html/html.ts';
import { visiblePieces } from '../html/visible-text.ts';
import { foldText, wordsOf } from '../text/words.ts';

/** Folded word to what it says: decibans for the first queue (above 0) or for its rival. */
export type WordWeights = ReadonlyMap<string, number>;

/** Words that weigh enough to be marked. Below a deciban (odds of 1.26 to 1) nobody would feel it. */
export function wordWeights(balance: Balance | undefined): WordWeights {
  const items = balance?.groups.find(({ kind }) => kind === 'word')?.items ?? [];
  return new Map(
    items.filter(({ decibans }) => Math.abs(decibans) >= 1).map((item) => [item.label, item.decibans]),
  );
}

const wordRun = /[\p{L}\p{M}\p{N}]+/gu;

/** Text as markup: words that speak for one of two queues are marked, hidden code points named, nothing else. At most
 *  `settleMarksMax` marks. */
export function createMarker(weights: WordWeights): (text: string) => Content {
  let marks = 0;
  const markWords = (text: string): Content[] => {
    const out: Content[] = [];
    let from = 0;
    for (const match of text.matchAll(wordRun)) {
      const weight = weights.get(wordsOf(foldText(match[0]))[0] ?? '');
      if (weight === undefined || marks >= bounds.settleMarksMax) continue;
      marks += 1;
      out.push(text.slice(from, match.index), html`<mark class="${classOf(weight)}">${match[0]}</mark>`);
      from = match.index + match[0].length;
    }
    return [...out, text.slice(from)];
  };
  return (text) =>
    visiblePieces(text).map((piece) =>
      piece.isName ? html`<span class="hidden-mark">${piece.text}</span>` : markWords(piece.text),
    );
}

/** Which queue it speaks for, and how strongly: 1 to 3 for over 1, 3 and 6 decibans (odds of 1.3, 2 and 4 to 1). */
function classOf(weight: number): string {
  const size = Math.abs(weight);
  return `${weight > 0 ? 'one' : 'two'} w${size >= 6 ? 3 : size >= 3 ? 2 : 1}`;
}
