import { bounds } from '../bounds.ts';

const notAscii = /[^\0-\x7f]/;
const ignorable = /\p{Default_Ignorable_Code_Point}+/gu;
/** Normalising sorts the marks behind a letter, which takes the square of their number (64 K of them: 2 s); no writing
 *  needs more than 30 (Unicode Standard Annex 15, section 13, Stream-Safe Text Format). */
const tooManyMarks = /(\p{M}{30})\p{M}+/gu;
const wordRun = /[\p{L}\p{M}\p{N}]+/gu;
/** Scripts written without spaces; script extensions, so that the long-vowel mark of kana counts as kana. */
const unspaced =
  /[\p{scx=Han}\p{scx=Hiragana}\p{scx=Katakana}\p{scx=Thai}\p{scx=Lao}\p{scx=Khmer}\p{scx=Myanmar}]+/gu;
/** Thai is the first of them in code order, so that most words need no look by script. */
const firstUnspaced = /[\u0e00-\u{3ffff}]/u;
// The root locale: dictionaries are chosen by script, and no setting of the host may change a token.
const segmenter = new Intl.Segmenter('und', { granularity: 'word' });

/** The two texts folded last. */
let last = { text: '', folded: '' };
let older = { text: '', folded: '' };

/** Text as tokens are made from it: compatibility forms unified (NFKC), invisible code points removed, case folded.
 *  Bounded by `featureChars`; the end of a longer text is not looked at.
 *  JavaScript has no full case folding: lower-casing differs from it in the two letters mended here (Unicode 15,
 *  CaseFolding.txt, statuses C and F), besides letters that NFKC or rarity takes out of play. */
export function foldText(text: string): string {
  // Features and guards ask for the same subject and body in turn.
  if (text === last.text) return last.folded;
  if (text !== older.text) {
    older.text = text;
    older.folded = fold(text);
  }
  const found = older;
  older = last;
  last = found;
  return found.folded;
}

function fold(text: string): string {
  const bounded = text.length > bounds.featureCharsMax ? text.slice(0, bounds.featureCharsMax) : text;
  if (!notAscii.test(bounded)) return bounded.toLowerCase();
  const unified = bounded.replace(tooManyMarks, '$1').normalize('NFKC').replace(ignorable, '').toLowerCase();
  const folded = unified.replaceAll('ß', 'ss').replaceAll('ς', 'σ');
  // NFKC can make one letter eighteen (U+FDFA).
  return folded.length > bounds.featureCharsMax ? folded.slice(0, bounds.featureCharsMax) : folded;
}

/** The words of folded text, in order, repeats kept: runs of letters, marks and digits; runs of scripts without
 *  spaces are cut by dictionary. A word longer than `wordChars` is cut to it. */
export function wordsOf(folded: string): string[] {
  const words: string[] = [];
  eachWord(folded, (text, from, to) => {
    words.push(text.slice(from, to));
  });
  return words;
}

/** The same words by their place, `text[from .. to)`: no string is made of them where all is ASCII, which takes half the
 *  time. */
export function eachWord(folded: string, visit: (text: string, from: number, to: number) => void): void {
  if (!notAscii.test(folded)) {
    eachPlainWord(folded, visit);
    return;
  }
  const words: string[] = [];
  const hasUnspaced = firstUnspaced.test(folded);
  for (const run of folded.match(wordRun) ?? []) {
    if (hasUnspaced && firstUnspaced.test(run)) pushUnspaced(run, words);
    else words.push(cut(run));
  }
  for (const word of words) visit(word, 0, word.length);
}

function eachPlainWord(folded: string, visit: (text: string, from: number, to: number) => void): void {
  const { length } = folded;
  for (let i = 0; i < length; i++) {
    if (!isPlainLetter(folded.charCodeAt(i))) continue;
    const from = i;
    do i++;
    while (i < length && isPlainLetter(folded.charCodeAt(i)));
    visit(folded, from, Math.min(i, from + bounds.wordCharsMax));
  }
}

/** A lower-case letter or a digit of ASCII. */
function isPlainLetter(unit: number): boolean {
  return unit >= 0x61 ? unit <= 0x7a : unit >= 0x30 && unit <= 0x39;
}

/** Whether folded text holds letters of a script without spaces: its words depend on their neighbours. */
export function isUnspaced(folded: string): boolean {
  return firstUnspaced.test(folded) && folded.search(unspaced) !== -1;
}

function pushUnspaced(run: string, words: string[]): void {
  let from = 0;
  for (const match of run.matchAll(unspaced)) {
    if (match.index > from) words.push(cut(run.slice(from, match.index)));
    pushSegments(match[0], words);
    from = match.index + match[0].length;
  }
  if (from < run.length) words.push(cut(run.slice(from)));
}

/** The segmenter's time grows faster than its input (200,000 characters: 100 s on Node 20), so it is fed slices. */
function pushSegments(run: string, words: string[]): void {
  if (run.length === 1) {
    words.push(run);
    return;
  }
  for (let from = 0; from < run.length; ) {
    const to = wholeEnd(run, Math.min(run.length, from + bounds.segmentCharsMax));
    for (const part of segmenter.segment(run.slice(from, to))) words.push(cut(part.segment));
    from = to;
  }
}

function cut(word: string): string {
  return word.length <= bounds.wordCharsMax ? word : word.slice(0, wholeEnd(word, bounds.wordCharsMax));
}

/** `end`, or one less where a cut there would halve a surrogate pair. */
function wholeEnd(text: string, end: number): number {
  const unit = text.charCodeAt(end - 1);
  return end < text.length && unit >= 0xd800 && unit < 0xdc00 ? end - 1 : end;
}
