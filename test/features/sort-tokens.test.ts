import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { sortTokens } from '../../src/features/sort-tokens.ts';

const sorted = (tokens: readonly number[]) => [
  ...sortTokens(Float64Array.of(...tokens, 7, 7), tokens.length, new Float64Array(tokens.length)),
];

describe('sorting tokens', () => {
  it.each([
    [[], []],
    [[5], [5]],
    [
      [2 ** 40 - 1, 0],
      [0, 2 ** 40 - 1],
    ],
    [
      [3, 1, 2],
      [1, 2, 3],
    ],
    [
      [2 ** 39, 2 ** 39 - 1, 2 ** 39 + 1],
      [2 ** 39 - 1, 2 ** 39, 2 ** 39 + 1],
    ],
  ])('%j', (tokens, expected) => {
    expect(sorted(tokens)).toEqual(expected);
  });

  it('gives what comparing gives, also when tokens crowd together', () => {
    const even = fc.array(
      fc.nat(2 ** 31 - 1).map((n) => n * 512 + (n % 512)),
      { maxLength: 5000 },
    );
    const crowded = fc.array(fc.nat(1000), { maxLength: 300 });
    fc.assert(
      fc.property(fc.oneof(even, crowded), (tokens) => {
        expect(sorted(tokens)).toEqual([...tokens].sort((a, b) => a - b));
      }),
      { seed: 20267, numRuns: 200 },
    );
  });
});
