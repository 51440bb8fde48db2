import fc from 'fast-check';
import { expect, test } from 'vitest';
import { indexTokens, rowIn } from '../../src/model/token-index.ts';

const token = fc.oneof(
  fc.nat(50),
  fc.nat(2 ** 40 - 1),
  fc.nat(50).map((n) => 2 ** 40 - 1 - n),
);

test('every token is found at its row, and no other token is found', () => {
  fc.assert(
    fc.property(fc.uniqueArray(token, { maxLength: 300 }), fc.array(token), (held, others) => {
      const tokens = Float64Array.from(held).sort();
      const index = indexTokens(tokens);
      tokens.forEach((t, row) => {
        expect(rowIn(index, t)).toBe(row);
      });
      for (const other of others) expect(rowIn(index, other)).toBe(tokens.indexOf(other));
    }),
  );
});
