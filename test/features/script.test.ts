import { describe, expect, it } from 'vitest';
import { scriptOf } from '../../src/features/script.ts';

describe('script of a text', () => {
  it.each([
    ['Where is my bill?', 'latin'],
    ['Gdzie jest mój rachunek?', 'latin'],
    ['Πού είναι ο λογαριασμός;', 'greek'],
    ['Где мой счёт?', 'cyrillic'],
    ['איפה החשבון', 'hebrew'],
    ['أين فاتورتي', 'arabic'],
    ['मेरा बिल कहाँ है', 'devanagari'],
    ['ใบแจ้งหนี้', 'thai'],
    ['청구서가 어디에', 'hangul'],
    ['請求書はどこですか', 'kana'],
    ['我的账单在哪里', 'han'],
    ['ჩემი ანგარიში', 'other'],
    ['12 345 —', 'missing'],
    ['', 'missing'],
    ['Hi, где мой счёт за воду?', 'cyrillic'],
  ])('%s', (text, expected) => {
    expect(scriptOf(text)).toBe(expected);
  });

  it('stays Chinese with one Japanese name among many Han letters', () => {
    // 2 kana of 42: under a tenth.
    expect(scriptOf(`${'水'.repeat(40)}のカ`)).toBe('han');
  });
});
