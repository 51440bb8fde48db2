import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { Features } from '../../src/features/schema.ts';
import { encodeCounts } from '../../src/model/codec-counts.ts';
import type { Entry } from '../../src/model/counts.ts';
import { type Block, defaultFit, type Fit, type TokensBlock } from '../../src/model/fit.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { combine, explainParts, normalise, posteriorOf } from '../../src/model/posterior-of.ts';
import { blockScores } from '../../src/model/score.ts';
import { createScorer } from '../../src/model/scorer.ts';
import { emptyTable, serve } from '../../src/model/served-table.ts';
import { confirmations, features, queueNames, schema, undone } from './examples.ts';

const empty = emptyCounts(schema);

/** Every kind of block there is: both readings, several concentrations, every part. */
const everyBlock: Fit = {
  ...defaultFit(schema),
  blocks: [
    ...defaultFit(schema).blocks,
    ...(['tokens', 'messages'] as const).flatMap((draws) =>
      (['all', 'for', 'against', 'absent'] as const).map(
        (part, i): TokensBlock => ({
          kind: 'tokens',
          region: 'word',
          draws,
          concentrations: [3, 30, 300],
          pooledRate: 'fixed',
          part,
          exponent: 0.1 * (i + 1),
          byQueue: { leaks: 0.05 },
        }),
      ),
    ),
  ],
  bias: { moving: 0.25 },
};

const scorerOf = (entries: readonly Entry[], fit: Fit = everyBlock, queues: readonly string[] = queueNames) =>
  createScorer(serve(foldEntries(empty, entries), fit, { halfLifeDays: null }), [], queues, null);
const closeTo = (a: Float64Array, b: Float64Array) => {
  expect(a.length).toBe(b.length);
  a.forEach((x, i) => {
    expect(Math.abs(x - b[i])).toBeLessThan(1e-9 * Math.max(1, Math.abs(x)));
  });
};

describe('laws of scoring', () => {
  test('the posterior sums to 1, over the listed queues in their order', () => {
    fc.assert(
      fc.property(confirmations, features, (entries, message) => {
        const posterior = posteriorOf(scorerOf(entries, everyBlock, ['moving', 'new', 'leaks']), message);
        expect(posterior.queues).toEqual(['moving', 'new', 'leaks']);
        for (const p of [posterior.probability, posterior.logProb.map(Math.exp)]) {
          expect(Math.abs(p.reduce((a, b) => a + b) - 1)).toBeLessThan(1e-12);
        }
      }),
    );
  });

  test('scoring leaves the counts as they were', () => {
    fc.assert(
      fc.property(confirmations, features, (entries, message) => {
        const counts = foldEntries(empty, entries);
        const before = encodeCounts(counts);
        const scorer = createScorer(serve(counts, everyBlock, { halfLifeDays: null }), [], queueNames, null);
        const first = posteriorOf(scorer, message).logProb;
        for (const entry of entries) posteriorOf(scorer, entry.features);
        expect(posteriorOf(scorer, message).logProb).toEqual(first);
        expect(encodeCounts(counts)).toEqual(before);
      }),
    );
  });

  test('leaving a message out equals unfolding it', () => {
    fc.assert(
      fc.property(
        confirmations.filter((entries) => entries.length > 1),
        (entries) => {
          const queue = queueNames.indexOf(entries[0].plus?.queue as string);
          const left = blockScores(scorerOf(entries), entries[0].features, { queue, weight: 1 });
          closeTo(left, blockScores(scorerOf([...entries, undone(entries[0])]), entries[0].features));
        },
      ),
    );
  });

  test('entries over a table score as if they had been folded into it', () => {
    fc.assert(
      fc.property(
        confirmations,
        confirmations,
        features,
        fc.constantFrom(null, 14),
        (before, after, message, halfLifeDays) => {
          const known: Entry[] = [
            ...before,
            { features: message, said: null, minus: null, plus: { queue: 'leaks', epoch: 2906 } },
          ];
          const table = serve(foldEntries(empty, known), everyBlock, { halfLifeDays });
          const whole = serve(foldEntries(empty, [...known, ...after]), everyBlock, { halfLifeDays });
          const overlaid = createScorer(table, after, queueNames, halfLifeDays);
          closeTo(
            blockScores(overlaid, message),
            blockScores(createScorer(whole, [], queueNames, halfLifeDays), message),
          );
        },
      ),
    );
  });

  test('the posterior, scored by what is remembered of each token, is that of the blocks', () => {
    fc.assert(
      fc.property(
        confirmations,
        confirmations,
        fc.array(features, { minLength: 2, maxLength: 4 }),
        (entries, later, messages) => {
          const scorer = createScorer(
            serve(foldEntries(empty, entries), everyBlock, { halfLifeDays: null }),
            later,
            queueNames,
            null,
          );
          for (const message of [...messages, ...messages]) {
            closeTo(
              posteriorOf(scorer, message).logProb,
              normalise(combine(scorer, blockScores(scorer, message))),
            );
          }
        },
      ),
    );
  });

  test('an entry that takes back what the table holds scores as if it had never been', () => {
    fc.assert(
      fc.property(confirmations, confirmations, features, (kept, taken, message) => {
        const table = serve(foldEntries(empty, [...kept, ...taken]), everyBlock, { halfLifeDays: null });
        const undoing = createScorer(table, taken.map(undone), queueNames, null);
        closeTo(blockScores(undoing, message), blockScores(scorerOf(kept), message));
      }),
    );
  });

  test('the parts of an explanation add up to the log posterior before normalisation', () => {
    fc.assert(
      fc.property(confirmations, features, (entries, message) => {
        const scorer = scorerOf(entries);
        const sum = new Float64Array(queueNames.length);
        for (const part of explainParts(scorer, message))
          for (let k = 0; k < sum.length; k++) sum[k] += part.score[k];
        closeTo(sum, combine(scorer, blockScores(scorer, message)));
      }),
    );
  });

  test('a token never seen adds exactly nothing', () => {
    fc.assert(
      fc.property(confirmations, (entries) => {
        const [block] = everyBlock.blocks.filter((b) => b.kind === 'tokens');
        const scorer = scorerOf(entries, {
          ...everyBlock,
          blocks: [{ ...block, draws: 'tokens' } as TokensBlock],
        });
        const strange: Features = {
          schema: schema.id,
          slots: [0, 0],
          regions: schema.regions.map(() => Float64Array.of(123456789)),
        };
        const isSeen = entries.some((e) => e.features.regions.some((tokens) => tokens.includes(123456789)));
        if (!isSeen) expect([...blockScores(scorer, strange)]).toEqual([0, 0, 0]);
      }),
    );
  });

  test('renaming the order of queues permutes the posterior', () => {
    fc.assert(
      fc.property(confirmations, features, (entries, message) => {
        const ahead = posteriorOf(scorerOf(entries), message).logProb;
        const behind = posteriorOf(scorerOf(entries, everyBlock, [...queueNames].reverse()), message).logProb;
        closeTo(ahead, behind.toReversed());
      }),
    );
  });
});

describe('by hand', () => {
  const message = (words: number[], slots = [2, 2]): Features => ({
    schema: schema.id,
    slots,
    regions: [new Float64Array(0), Float64Array.from(words), new Float64Array(0)],
  });
  const confirm = (queue: string, words: number[]): Entry => ({
    features: message(words),
    said: null,
    minus: null,
    plus: { queue, epoch: 2910 },
  });

  test('nothing learned: every queue is as likely as any other', () => {
    const posterior = posteriorOf(
      createScorer(emptyTable(schema), [], ['a', 'b', 'c', 'd'], null),
      message([1]),
    );
    for (const p of posterior.probability) expect(p).toBeCloseTo(0.25, 12);
    expect(posterior).toMatchObject({ tokens: 1, knownTokens: 0 });
  });

  test('prior and slot follow the closed form', () => {
    const scorer = scorerOf([confirm('billing', []), confirm('billing', []), confirm('leaks', [])]);
    const scores = blockScores(scorer, message([], [2, 0]));
    // Prior, α = 1: (1 + 2)/(3 + 3), (1 + 1)/6, (1 + 0)/6.
    expect([...scores.subarray(0, 3)].map(Math.exp).map((p) => p.toFixed(6))).toEqual([
      '0.500000',
      '0.333333',
      '0.166667',
    ]);
    // channel = mail, β = 1 of 4 values about its share m = (3 + ½)/(3 + 2) = 0.7: (2.8 + 2)/(4 + 2), (2.8 + 1)/(4 + 1), 2.8/4.
    expect([...scores.subarray(3, 6)].map(Math.exp).map((p) => p.toFixed(6))).toEqual([
      '0.800000',
      '0.760000',
      '0.700000',
    ]);
    // hour = missing, never seen, of 3 values, m = ½/(3 + 1½) = 1/9: ⅓/(3 + 2), ⅓/(3 + 1), ⅓/3.
    expect([...scores.subarray(6, 9)].map(Math.exp).map((p) => p.toFixed(6))).toEqual([
      '0.066667',
      '0.083333',
      '0.111111',
    ]);
  });

  test('a slot about an even base follows the textbook', () => {
    const blocks = everyBlock.blocks.map((block): Block => {
      if (block.kind !== 'slots') return block;
      const { base: _, ...even } = block;
      return even;
    });
    const entries = [confirm('billing', []), confirm('billing', []), confirm('leaks', [])];
    const scores = blockScores(scorerOf(entries, { ...everyBlock, blocks }), message([], [2, 0]));
    // channel = mail, β = 1 of 4 values: (1 + 2)/(4 + 2), (1 + 1)/(4 + 1), 1/4.
    expect([...scores.subarray(3, 6)].map(Math.exp).map((p) => p.toFixed(6))).toEqual([
      '0.500000',
      '0.400000',
      '0.250000',
    ]);
  });

  test('a queue that closed takes no part, and its counts leave the pooled rates', () => {
    const entries = [confirm('billing', [1]), confirm('leaks', [2])];
    const closed = blockScores(
      scorerOf([...entries, confirm('moving', [1, 2])], everyBlock, ['billing', 'leaks']),
      message([1]),
    );
    const never = blockScores(scorerOf(entries, everyBlock, ['billing', 'leaks']), message([1]));
    closeTo(closed, never);
  });

  test('known tokens are counted over all regions', () => {
    const posterior = posteriorOf(scorerOf([confirm('billing', [1, 2])]), message([1, 2, 3]));
    expect(posterior).toMatchObject({ tokens: 3, knownTokens: 2 });
  });

  test('features of another schema are refused', () => {
    expect(() => posteriorOf(scorerOf([]), { ...message([]), schema: 'ffffffffffffffff' })).toThrow(
      'schema-mismatch at features',
    );
  });
});
