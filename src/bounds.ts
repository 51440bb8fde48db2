/** Every bound of the project, each with its reason. Units stand last in the name. */
export const bounds = {
  /** Largest raw message read: the receiving service accepts 40 MB with headers. */
  rawBytesMax: 40 * 1024 * 1024,
  /** Entries folded in one pass: two columns each keep (token, column) below 2^40 * 2^13 = 2^53, exact in a double. */
  foldEntriesMax: 4096,

  // Features (src/features)
  /** Text that tokens are drawn from: about 10,000 words, far beyond any request to a desk; bounds the time of a flood. */
  featureCharsMax: 64 * 1024,
  /** Longer runs are not words (base64, keys): the longest words of running text in any language stay below. */
  wordCharsMax: 40,
  /** The dictionary segmenter grows faster than its input; slices of this size keep it linear. */
  segmentCharsMax: 256,
  /** Letters of a gram. */
  gramChars: 4,
  /** Distinct tokens kept of one message, the first in reading order. Of 3,278 long posts 99 % hold at most 700 words,
   *  1,560 pairs and 2,360 grams; a message then weighs at most 50 KB in its history. */
  subjectTokensMax: 64,
  wordTokensMax: 1024,
  pairTokensMax: 2048,
  gramTokensMax: 3072,
  /** Hashes of tokens held in memory between messages, twice this at most: about 15 MB. */
  rememberedTokensMax: 64 * 1024,
} as const;
