import { describe, expect, test } from 'vitest';
import type { Features, Schema } from '../../src/features/schema.ts';
import type { Entry } from '../../src/model/counts.ts';
import { defaultFit, type Fit, type TokensBlock } from '../../src/model/fit.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { posteriorOf } from '../../src/model/posterior-of.ts';
import { blockScores } from '../../src/model/score.ts';
import { createScorer } from '../../src/model/scorer.ts';
import { serve } from '../../src/model/served-table.ts';
import regions from './regions.json' with { type: 'json' };

/** The reference reads each region twice: shares of tokens with s = 100, presence in messages with s = 1. */
const schema: Schema = {
  id: 'bbbbbbbbbbbbbbbb',
  version: 1,
  slots: [],
  regions: regions.regions.map(({ id }) => ({ id, tokensMax: 100 })),
};
const featuresOf = (part: 'learn' | 'score', i: number): Features => ({
  schema: schema.id,
  slots: [],
  regions: regions.regions.map((region) => Float64Array.from(region[part][i])),
});
const blocks = regions.regions.flatMap(({ id, readings }, g) =>
  readings.map(
    ({ kind, concentration }, r): TokensBlock => ({
      kind: 'tokens',
      region: id,
      draws: kind === 'share' ? 'tokens' : 'messages',
      concentrations: [concentration],
      pooledRate: 'unknown',
      part: 'all',
      exponent: regions.exponents[1 + 2 * g + r],
      byQueue: {},
    }),
  ),
);
const fit: Fit = {
  ...defaultFit(schema),
  alpha: 1,
  blocks: [{ kind: 'prior', exponent: regions.exponents[0], byQueue: {} }, ...blocks],
};
const entries = regions.learnQueue.map(
  (queue, i): Entry => ({
    features: featuresOf('learn', i),
    said: null,
    minus: null,
    plus: { queue: regions.queues[queue], epoch: 0 },
  }),
);
const table = serve(foldEntries(emptyCounts(schema), entries), fit, { halfLifeDays: null });
const scorer = createScorer(table, [], regions.queues, null);

describe("the reference script's scores", () => {
  test.each(blocks.map((block, b) => [block.region, block.draws, b] as const))(
    '%s, drawing %s',
    (_region, _draws, b) => {
      const { scores } = regions.regions[b >> 1].readings[b % 2];
      expect(scores).toHaveLength(20);
      scores.forEach((expected, i) => {
        const all = blockScores(scorer, featuresOf('score', i));
        expected.forEach((x, k) => {
          expect(Math.abs(all[(1 + b) * regions.queues.length + k] - x)).toBeLessThan(1e-9);
        });
      });
    },
  );

  test('with its exponents, the posterior', () => {
    regions.logProb.forEach((expected, i) => {
      const { logProb } = posteriorOf(scorer, featuresOf('score', i));
      expected.forEach((x, k) => {
        expect(Math.abs(logProb[k] - x)).toBeLessThan(1e-9);
      });
    });
  });
});
