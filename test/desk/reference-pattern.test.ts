import { describe, expect, it } from 'vitest';
import { matcherOf } from '../../src/desk/reference-pattern.ts';

const isIn = (pattern: string, text: string) => matcherOf({ id: 'r', pattern })(text);

describe('reference pattern', () => {
  it.each([
    ['FW-########', 'account fw-12345678, please'],
    ['FW-########', 'fw-12345678'],
    ['FW-########', '(fw-12345678)'],
    ['@@##', 'my code ab12.'],
    ['@@##', 'мой код жя12'],
    ['#.#', 'version 1.2 of'],
    ['(##)', 'see (12)'],
    ['[#]', '[7]'],
    ['^#$', 'odd ^5$ text'],
  ])('%s is in “%s”', (pattern, text) => {
    expect(isIn(pattern, text)).toBe(true);
  });

  it.each([
    ['FW-########', 'fw-1234567'],
    ['FW-########', 'fw-123456789'],
    ['FW-########', 'xfw-12345678'],
    ['FW-########', 'fw 12345678'],
    ['########', 'call 020794600001'],
    ['@@##', 'abc12'],
    ['#.#', 'version 1x2 of'],
    ['##', '٣٤'], // Arabic-Indic digits are no ASCII digits
  ])('%s is not in “%s”', (pattern, text) => {
    expect(isIn(pattern, text)).toBe(false);
  });

  it('takes time in proportion to the text, however often a match almost happens', () => {
    // 40 × 65,536 steps at most; a pattern with repetition could need the square.
    expect(isIn(`${'#'.repeat(39)}x`, '1'.repeat(65_536))).toBe(false);
  });
});
