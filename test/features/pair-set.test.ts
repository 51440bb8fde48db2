import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { createPairSet } from '../../src/features/pair-set.ts';

describe('pair set', () => {
  it('knows what was added since it was emptied, as a set of text does', () => {
    const pair = fc.tuple(fc.nat(40), fc.nat(40));
    const set = createPairSet(64);
    fc.assert(
      fc.property(fc.array(pair, { maxLength: 64 }), (pairs) => {
        set.clear();
        const known = new Set<string>();
        for (const [left, right] of pairs) {
          expect(set.add(left, right)).toBe(!known.has(`${left} ${right}`));
          known.add(`${left} ${right}`);
        }
      }),
      { seed: 20266, numRuns: 500 },
    );
  });

  it('holds as many as it was made for, in order or not', () => {
    const set = createPairSet(2048);
    set.clear();
    for (let i = 0; i < 2048; i++) expect(set.add(i, i + 1)).toBe(true);
    for (let i = 2047; i >= 0; i--) expect(set.add(i, i + 1)).toBe(false);
    expect(set.add(1, 1)).toBe(true);
  });
});
