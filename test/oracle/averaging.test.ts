import { describe, expect, test } from 'vitest';
import type { Features, Schema } from '../../src/features/schema.ts';
import type { Entry } from '../../src/model/counts.ts';
import { defaultFit, type Fit, type TokensBlock } from '../../src/model/fit.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { blockScores } from '../../src/model/score.ts';
import { createScorer } from '../../src/model/scorer.ts';
import { serve } from '../../src/model/served-table.ts';
import averaging from './averaging.json' with { type: 'json' };
import corpus from './regions.json' with { type: 'json' };

const schema: Schema = {
  id: 'cccccccccccccccc',
  version: 1,
  slots: [],
  regions: corpus.regions.map(({ id }) => ({ id, tokensMax: 100 })),
};
const readings = ['tokens', 'messages'] as const;
const parts = ['for', 'against', 'absent'] as const;
const concentrations = { tokens: [3, 30, 300, 3000], messages: [0.3, 3, 30, 300] };
const blocks = corpus.regions.flatMap(({ id }) =>
  readings.flatMap((draws) =>
    parts.map(
      (part): TokensBlock => ({
        kind: 'tokens',
        region: id,
        draws,
        concentrations: concentrations[draws],
        pooledRate: 'fixed',
        part,
        exponent: 1,
        byQueue: {},
      }),
    ),
  ),
);
const fit: Fit = { ...defaultFit(schema), blocks };
const featuresOf = (part: 'learn' | 'score', i: number): Features => ({
  schema: schema.id,
  slots: [],
  regions: corpus.regions.map((region) => Float64Array.from(region[part][i])),
});
const entries = corpus.learnQueue.map(
  (queue, i): Entry => ({
    features: featuresOf('learn', i),
    said: null,
    minus: null,
    plus: { queue: corpus.queues[queue], epoch: 0 },
  }),
);
const table = serve(foldEntries(emptyCounts(schema), entries), fit, { halfLifeDays: null });
const scorer = createScorer(table, [], corpus.queues, null);

function expectBlocks(
  actual: Float64Array,
  expected: (draws: 'tokens' | 'messages', g: number) => number[][],
): void {
  blocks.forEach((block, b) => {
    const g = Math.floor(b / 6);
    expected(block.draws, g)[b % 3].forEach((x, k) => {
      expect(Math.abs(actual[b * corpus.queues.length + k] - x)).toBeLessThan(1e-9);
    });
  });
}

describe('blocks averaged over concentrations equal what the long way gives', () => {
  test('for messages not counted', () => {
    for (let i = 0; i < 20; i++) {
      expectBlocks(blockScores(scorer, featuresOf('score', i)), (draws, g) => averaging[g].scores[draws][i]);
    }
  });

  test('for messages counted, left out', () => {
    for (let i = 0; i < 12; i++) {
      const own = { queue: corpus.learnQueue[i], weight: 1 };
      const actual = blockScores(scorer, featuresOf('learn', i), own);
      expectBlocks(actual, (draws, g) => averaging[g].leaveOneOut[draws][i]);
    }
  });
});
