import { eachWord } from '../text/words.ts';
import { createPairSet } from './pair-set.ts';
import { regionSchemas } from './schema-of.ts';
import type { SipHash } from './siphash.ts';
import {
  createVocabulary,
  firstWord,
  gramsEndOffset,
  lastWord,
  seenOffset,
  subjectSeenOffset,
  tokenOffset,
  wordStride,
} from './vocabulary.ts';

/** The distinct tokens of a message by region, in reading order, with their texts when these were asked for. Good until the
 *  next message is read. */
export interface ReadTokens {
  /** Longer than what was read: the tokens are the first `lengths[region]`. */
  readonly regions: readonly Float64Array[];
  readonly lengths: readonly number[];
  readonly texts: readonly (readonly string[])[];
}

/** Folded. */
export interface Texts {
  readonly subject: string;
  /** What this writer wrote. */
  readonly body: string;
  /** All that there is to read, with what is quoted and forwarded; empty where that is nothing more. */
  readonly whole: string;
}

/** Reads the tokens of every region: those of the subject's words; words, pairs and grams of subject and body in a row; last,
 *  what words else stand in the whole text. */
export type TokenReader = (texts: Texts, withTexts: boolean) => ReadTokens;

/** Places of the regions in the schema. */
const [subjectRegion, wordRegion, pairRegion, gramRegion] = [0, 1, 2, 3] as const;

/** Of each region the first `tokensMax` in reading order are taken: a flood behind a message's beginning cannot push the
 *  beginning out, nor can what is quoted push out what the writer wrote. */
export function createTokenReader(sipHash: SipHash): TokenReader {
  const vocabulary = createVocabulary(sipHash);
  const { words, grams, gramFacts } = vocabulary;
  const taken = regionSchemas.map((region) => new Float64Array(region.tokensMax));
  const lengths = taken.map(() => 0);
  const pairs = createPairSet(taken[pairRegion]!.length);
  let texts: string[][] | null = null;
  let message = 0;
  let previous = firstWord;

  const hasRoom = (region: number) => lengths[region]! < taken[region]!.length;
  const take = (region: number, token: number) => {
    taken[region]![lengths[region]!++] = token;
  };

  function takeSubjectWord(text: string, from: number, to: number): void {
    const word = vocabulary.word(text, from, to);
    const at = word * wordStride;
    if (words[at + subjectSeenOffset] === message || !hasRoom(subjectRegion)) return;
    words[at + subjectSeenOffset] = message;
    take(subjectRegion, words[at + tokenOffset]!);
    texts?.[subjectRegion]?.push(vocabulary.wordText(word));
  }

  function takeWord(text: string, from: number, to: number): void {
    if (!hasRoom(wordRegion) && !hasRoom(pairRegion) && !hasRoom(gramRegion)) return;
    const word = vocabulary.word(text, from, to);
    takePair(previous, word);
    previous = word;
    const at = word * wordStride;
    if (words[at + seenOffset] === message) return;
    words[at + seenOffset] = message;
    takeGrams(words[at - wordStride + gramsEndOffset]!, words[at + gramsEndOffset]!);
    if (!hasRoom(wordRegion)) return;
    take(wordRegion, words[at + tokenOffset]!);
    texts?.[wordRegion]?.push(vocabulary.wordText(word));
  }

  function takePair(left: number, right: number): void {
    if (!hasRoom(pairRegion) || !pairs.add(left, right)) return;
    take(pairRegion, vocabulary.pair(left, right));
    texts?.[pairRegion]?.push(`${vocabulary.wordText(left)} ${vocabulary.wordText(right)}`);
  }

  // The innermost loop: what it needs is at hand.
  function takeGrams(from: number, to: number): void {
    const out = taken[gramRegion]!;
    let length = lengths[gramRegion]!;
    for (let i = from; i < to && length < out.length; i++) {
      const at = 2 * grams[i]!;
      if (gramFacts[at + 1] === message) continue;
      gramFacts[at + 1] = message;
      out[length++] = gramFacts[at]!;
      if (texts !== null) texts[gramRegion]!.push(vocabulary.gramText(at / 2));
    }
    lengths[gramRegion] = length;
  }

  function takeQuotedWord(text: string, from: number, to: number): void {
    if (!hasRoom(wordRegion)) return;
    const word = vocabulary.word(text, from, to);
    const at = word * wordStride;
    if (words[at + seenOffset] === message) return;
    words[at + seenOffset] = message;
    take(wordRegion, words[at + tokenOffset]!);
    texts?.[wordRegion]?.push(vocabulary.wordText(word));
  }

  return ({ subject, body, whole }, withTexts) => {
    message = vocabulary.begin();
    texts = withTexts ? taken.map(() => []) : null;
    lengths.fill(0);
    pairs.clear();
    eachWord(subject, takeSubjectWord);
    previous = firstWord;
    eachWord(subject, takeWord);
    eachWord(body, takeWord);
    takePair(previous, lastWord);
    eachWord(whole, takeQuotedWord);
    return { regions: taken, lengths, texts: texts ?? [] };
  };
}
