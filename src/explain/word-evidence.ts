import type { EvidencePart } from '../model/posterior.ts';

export interface WordEvidence {
  /** Folded, as tokens are made; or `restOfWords`. */
  readonly word: string;
  readonly decibans: number;
}

/** Stands for tokens whose text the message does not give away. */
export const restOfWords = '(words not shown)';

/** Evidence by word of the message: a word's own tokens, its share of the pairs that it stands in (half each) and of the
 *  letter grams that it holds (in equal parts among the words that hold it). Every part goes somewhere, so the sum stays.
 *  `words` maps `<region>:<token>` to the token's text. */
export function wordEvidence(
  parts: readonly EvidencePart[],
  words: ReadonlyMap<string, string>,
  decibansOf: (part: EvidencePart) => number,
): WordEvidence[] {
  const sums = new Map<string, number>();
  const vocabulary = vocabularyOf(words);
  for (const part of parts) {
    const owners = ownersOf(part.place, words.get(`${part.place}:${part.value}`), vocabulary);
    for (const owner of owners) sums.set(owner, (sums.get(owner) ?? 0) + decibansOf(part) / owners.length);
  }
  return [...sums].map(([word, decibans]) => ({ word, decibans }));
}

interface Vocabulary {
  readonly words: ReadonlySet<string>;
  /** Gram to the words that hold it. */
  readonly byGram: ReadonlyMap<string, readonly string[]>;
}

function vocabularyOf(words: ReadonlyMap<string, string>): Vocabulary {
  const distinct = new Set<string>();
  const grams: string[] = [];
  for (const [key, text] of words) {
    if (key.startsWith('word:') || key.startsWith('subject:')) distinct.add(text);
    else if (key.startsWith('gram:')) grams.push(text);
  }
  const wanted = new Set(grams);
  const lengths = new Set(grams.map((gram) => gram.length));
  const byGram = new Map<string, string[]>();
  for (const word of distinct) {
    const padded = ` ${word} `;
    for (const length of lengths) {
      for (let i = 0; i + length <= padded.length; i += 1) {
        const gram = padded.slice(i, i + length);
        if (!wanted.has(gram)) continue;
        const holders = byGram.get(gram) ?? [];
        if (holders.at(-1) !== word) byGram.set(gram, [...holders, word]);
      }
    }
  }
  return { words: distinct, byGram };
}

function ownersOf(region: string, text: string | undefined, vocabulary: Vocabulary): readonly string[] {
  if (text === undefined) return [restOfWords];
  if (vocabulary.words.has(text) && region !== 'gram') return [text];
  const owners =
    region === 'gram'
      ? (vocabulary.byGram.get(text) ?? [])
      : text.split(' ').filter((word) => vocabulary.words.has(word));
  return owners.length > 0 ? owners : [restOfWords];
}
