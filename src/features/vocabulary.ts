import { bounds } from '../bounds.ts';
import type { SipHash } from './siphash.ts';

/** Words met so far with their tokens and grams, so that a word costs one look-up wherever it stands. Words and grams are
 *  numbers here, and what is known of one lies side by side in an array: reading features is mostly waiting for memory.
 *  Forgets everything between messages when it holds more than `rememberedWordsMax`: memory is bounded, and no token
 *  depends on what is remembered. */
export interface Vocabulary {
  /** Begins a message: gives its number, from 1. Numbers of words of the last one must not be used any more. */
  begin(): number;
  /** The word `text[from .. to)`. */
  word(text: string, from: number, to: number): number;
  /** The token of two neighbouring words: the hash of their two tokens, five bytes each, low byte first. */
  pair(left: number, right: number): number;
  /** Of word w at `wordStride * w`: its token, the end of its grams in `grams` (they begin where those of word w - 1 end), and
   *  the numbers of the messages in which it was last met anywhere and in a subject, which the reader of a message writes. */
  readonly words: Float64Array;
  readonly grams: Uint32Array;
  /** Of gram g at `2 * g`: its token, and the number of the message in which it was last met. */
  readonly gramFacts: Float64Array;
  wordText(word: number): string;
  gramText(gram: number): string;
}

export const wordStride = 4;
export const [tokenOffset, gramsEndOffset, seenOffset, subjectSeenOffset] = [0, 1, 2, 3] as const;

/** Beginning and end of a text; no word is written like them. */
export const firstWord = 0;
export const lastWord = 1;

/** One message may bring as many as its characters allow, with a space between: half of them words, nearly all grams. */
const wordsMax = bounds.rememberedWordsMax + bounds.featureCharsMax / 2 + 64;
const gramsMax = bounds.rememberedWordsMax + bounds.featureCharsMax + 64;
/** A word has fewer grams than letters. */
const gramListMax = 8 * bounds.rememberedWordsMax;
const placesMin = 2 ** 14;

export function createVocabulary(sipHash: SipHash): Vocabulary {
  const words = new Float64Array(wordsMax * wordStride);
  const gramFacts = new Float64Array(2 * gramsMax);
  const grams = new Uint32Array(gramListMax + bounds.featureCharsMax);
  const gramNumbers = new Map<string, number>();
  let wordTexts: string[] = [];
  let gramTexts: string[] = [];
  /** Open addressing with steps of one, at most half full: a hash, and the number of its word plus 1; 0: free. */
  let places = new Int32Array(2 * placesMin);
  let message = 0;

  function addGram(text: string): number {
    const gram = gramTexts.length;
    gramNumbers.set(text, gram);
    gramTexts.push(text);
    gramFacts[2 * gram] = sipHash.textToken(text);
    gramFacts[2 * gram + 1] = 0;
    return gram;
  }

  /** A word without grams. */
  function addWord(text: string): number {
    const word = wordTexts.length;
    wordTexts.push(text);
    const at = word * wordStride;
    words[at + tokenOffset] = sipHash.textToken(text);
    words[at + gramsEndOffset] = word === 0 ? 0 : words[at - wordStride + gramsEndOffset]!;
    words[at + seenOffset] = 0;
    words[at + subjectSeenOffset] = 0;
    return word;
  }

  /** Every four letters in a row of the word with a space on both sides; a word of one letter gives ` a `. */
  function addGramsOf(word: number, text: string): void {
    const padded = ` ${text} `;
    const at = word * wordStride + gramsEndOffset;
    for (let i = 0; i < Math.max(1, text.length - 1); i++) {
      const gram = padded.slice(i, i + bounds.gramChars);
      grams[words[at]!++] = gramNumbers.get(gram) ?? addGram(gram);
    }
  }

  function putPlace(hash: number, word: number): void {
    const mask = places.length - 1;
    let place = (hash << 1) & mask;
    while (places[place + 1] !== 0) place = (place + 2) & mask;
    places[place] = hash;
    places[place + 1] = word + 1;
  }

  function growPlaces(): void {
    const old = places;
    places = new Int32Array(2 * old.length);
    for (let i = 0; i < old.length; i += 2) if (old[i + 1] !== 0) putPlace(old[i]!, old[i + 1]! - 1);
  }

  function forget(): void {
    places = new Int32Array(2 * placesMin);
    gramNumbers.clear();
    wordTexts = [];
    gramTexts = [];
    addWord('^');
    addWord('$');
  }
  forget();

  return {
    words,
    grams,
    gramFacts,
    begin() {
      const isFull =
        wordTexts.length > bounds.rememberedWordsMax ||
        gramTexts.length > bounds.rememberedWordsMax ||
        words[(wordTexts.length - 1) * wordStride + gramsEndOffset]! > gramListMax;
      if (isFull) forget();
      message += 1;
      return message;
    },
    word(text, from, to) {
      const hash = hashOf(text, from, to);
      const mask = places.length - 1;
      for (let place = (hash << 1) & mask; places[place + 1] !== 0; place = (place + 2) & mask) {
        const word = places[place + 1]! - 1;
        if (places[place] === hash && isAt(wordTexts[word]!, text, from, to)) return word;
      }
      // A copy: a slice would keep the whole text of the message in memory.
      const own = Buffer.from(text.slice(from, to)).toString();
      const word = addWord(own);
      addGramsOf(word, own);
      putPlace(hash, word);
      if (4 * wordTexts.length > places.length) growPlaces();
      return word;
    },
    pair: (left, right) =>
      sipHash.pairToken(words[left * wordStride + tokenOffset]!, words[right * wordStride + tokenOffset]!),
    wordText: (word) => wordTexts[word]!,
    gramText: (gram) => gramTexts[gram]!,
  };
}

/** FNV-1a over UTF-16 units (Fowler, Noll, Vo), its high bits mixed into the low ones; only for finding places. */
function hashOf(text: string, from: number, to: number): number {
  let hash = 0x811c9dc5 | 0;
  for (let i = from; i < to; i++) hash = Math.imul(hash ^ text.charCodeAt(i), 0x01000193);
  return hash ^ (hash >>> 15);
}

function isAt(word: string, text: string, from: number, to: number): boolean {
  if (word.length !== to - from) return false;
  for (let i = from; i < to; i++) if (word.charCodeAt(i - from) !== text.charCodeAt(i)) return false;
  return true;
}
