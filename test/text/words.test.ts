import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { foldText, wordsOf } from '../../src/text/words.ts';

const words = (text: string) => wordsOf(foldText(text));

describe('folding', () => {
  it.each([
    ['ASCII is lower-cased', 'Hello WORLD', 'hello world'],
    ['full-width forms become plain', 'ＦＷ１２３', 'fw123'],
    ['ligatures come apart', 'oﬃce', 'office'],
    ['sharp s and its capital are two letters', 'STRASSE Straße STRAẞE', 'strasse strasse strasse'],
    ['both small sigmas are one', 'ΟΔΟΣ οδός', 'οδοσ οδόσ'],
    ['composed and decomposed letters are one', 'cafe\u0301', 'café'],
    ['soft hyphens, zero-width and direction marks vanish', 'in\u00advo\u200bi\u202ece\ufeff', 'invoice'],
    ['superscripts become digits', 'm³', 'm3'],
  ])('%s', (_title, text, expected) => {
    expect(foldText(text)).toBe(expected);
  });

  it('looks at the first 65,536 characters, also when a letter unfolds into eighteen', () => {
    expect(foldText('ab'.repeat(40_000))).toHaveLength(65_536);
    expect(foldText('\ufdfa'.repeat(65_536))).toHaveLength(65_536);
  });
});

describe('words', () => {
  it.each([
    ['punctuation separates', "Don't pay: £45.20 (today)!", ['don', 't', 'pay', '45', '20', 'today']],
    ['underscores and dashes separate', 'snake_case well-known', ['snake', 'case', 'well', 'known']],
    ['combining marks stay inside a word', 'नमस्ते दुनिया', ['नमस्ते', 'दुनिया']],
    ['Arabic with vowel signs is one word', 'مَرْحَبًا بك', ['مَرْحَبًا', 'بك']],
    ['Greek and Cyrillic', 'Καλημέρα, привет', ['καλημέρα', 'привет']],
    ['Korean is written with spaces', '수도 요금', ['수도', '요금']],
    ['nothing', ' \n—', []],
  ])('%s', (_title, text, expected) => {
    expect(words(text)).toEqual(expected);
  });

  it('cuts scripts without spaces into words that join to the run', () => {
    const japanese = words('水道料金について教えてください');
    expect(japanese.join('')).toBe('水道料金について教えてください');
    expect(japanese.length).toBeGreaterThan(4);
    expect(japanese).toContain('水道');
    const thai = words('สวัสดีครับผมต้องการย้ายบ้าน');
    expect(thai.length).toBeGreaterThan(3);
    expect(thai).toContain('บ้าน');
  });

  it('parts a word where it leaves and enters a script without spaces', () => {
    expect(words('FW123号').slice(0, 1)).toEqual(['fw123']);
  });

  it('cuts a long word at 40 characters and never through a surrogate pair', () => {
    expect(words('a'.repeat(500))).toEqual(['a'.repeat(40)]);
    // U+10400 lower-cases to U+10428, two units each: 39 letters and a pair would end at unit 41.
    expect(words(`${'a'.repeat(39)}\u{10428}`)).toEqual(['a'.repeat(39)]);
  });

  it('keeps 30 marks behind a letter, so that 64 K of them are not sorted', () => {
    // U+0F71 and U+0F72 have different combining classes, 129 and 130: unsorted as given.
    expect(foldText(`a${'\u0f72\u0f71'.repeat(30_000)}b`)).toBe(
      `a${'\u0f71'.repeat(15)}${'\u0f72'.repeat(15)}b`,
    );
  });

  it('segments 60,000 Han characters in slices, in bounded time', () => {
    expect(words('水'.repeat(60_000)).join('')).toBe('水'.repeat(60_000));
  });

  it('never gives an empty, overlong or half-cut word, whatever the text', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary', maxLength: 200 }), (text) => {
        for (const word of words(text)) {
          expect(word.length).toBeGreaterThan(0);
          expect(word.length).toBeLessThanOrEqual(40);
          expect(word).not.toMatch(/\p{Cs}/u);
        }
      }),
      { seed: 20261, numRuns: 500 },
    );
  });
});
