import { describe, expect, test } from 'vitest';
import { cleanLine, cleanText, cutText } from '../../src/message/clean-text.ts';
import { Defects } from '../../src/message/defects.ts';

const clean = (text: string) => {
  const defects = new Defects();
  return { text: cleanText(text, '1', defects), codes: defects.list.map(({ code }) => code) };
};

describe('cleanText', () => {
  const cases: [what: string, text: string, cleaned: string, codes: string[]][] = [
    ['plain text', 'a\tb\nc', 'a\tb\nc', []],
    ['letters of any script', 'Zähler 水 счёт वर्ष', 'Zähler 水 счёт वर्ष', []],
    ['line ends', 'a\r\nb\rc\u2028d\u0085e', 'a\nb\nc\nd\ne', []],
    ['NUL and bell', 'a\0b\x07c', 'abc', ['control-characters']],
    ['C1 controls', 'a\x9bb', 'ab', ['control-characters']],
    ['wide spaces', 'a\u00a0b\u3000c\u2009d', 'a b c d', []],
    ['an override', 'a\u202eb\u202c', 'ab', ['direction-override']],
    ['direction marks', '\u200fאב\u200e\u2067x\u2069', 'אבx', []],
    ['zero width space', 'wa\u200bter', 'water', ['invisible-characters']],
    ['soft hyphen', 'wa\u00adter', 'water', ['invisible-characters']],
    ['Hangul filler', 'wa\u3164ter', 'water', ['invisible-characters']],
    ['tag characters', 'wa\u{e0061}ter', 'water', ['invisible-characters']],
    ['joiners that spelling needs', 'می\u200cخواهم क्\u200dष', 'می\u200cخواهم क्\u200dष', []],
    ['an emoji with its selector', '💧\ufe0f', '💧', []],
    ['piled marks', `e${'\u0301'.repeat(9)}`, `e${'\u0301'.repeat(4)}`, ['invisible-characters']],
    ['marks as languages use them', 'Việt ằ', 'Việt ằ', []],
    ['half a surrogate pair', 'a\ud800b', 'ab', []],
    ['Cyrillic among Latin', 'p\u0430yment', 'p\u0430yment', ['mixed-script-word']],
    ['Cyrillic beside Latin', 'счёт PDF', 'счёт PDF', []],
  ];
  test.each(cases)('%s', (_what, text, cleaned, codes) => {
    expect(clean(text)).toEqual({ text: cleaned, codes });
  });

  test('a line break in a header is on record and becomes a space', () => {
    const defects = new Defects();
    expect(cleanLine('a\r\nx-amz-meta-b: c', 'subject', defects)).toBe('a x-amz-meta-b: c');
    expect(defects.list).toEqual([{ code: 'line-break-in-header', place: 'subject' }]);
  });
});

describe('cutText', () => {
  test.each([
    ['short', 10, 'short'],
    ['two words', 6, 'two'],
    ['one-long-word-without-space', 8, 'one-long'],
    ['ab💧', 3, 'ab'],
  ])('%j to %i', (text, charsMax, cut) => {
    expect(cutText(text, charsMax)).toBe(cut);
  });
});
