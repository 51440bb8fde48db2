import { describe, expect, test } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import type { Features } from '../../src/features/schema.ts';
import { encodeTable } from '../../src/model/codec-table.ts';
import type { Entry } from '../../src/model/counts.ts';
import { findDrift } from '../../src/model/drift.ts';
import { defaultFit } from '../../src/model/fit.ts';
import { fitQueues, fitShared, type LabelledScores, meanLoss } from '../../src/model/fit-exponents.ts';
import { type FoldedMessage, fitFindings, fitTable } from '../../src/model/fit-table.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { minimise } from '../../src/model/minimise.ts';
import { posteriorOf } from '../../src/model/posterior-of.ts';
import { createScorer } from '../../src/model/scorer.ts';
import { serve } from '../../src/model/served-table.ts';
import { queueNames, schema } from './examples.ts';

/** mulberry32: small, seeded, good enough to draw test messages. */
function seeded(seed: number): () => number {
  let state = seed;
  return () => {
    state = (state + 0x6d2b79f5) | 0;
    let t = Math.imul(state ^ (state >>> 15), 1 | state);
    t = (t + Math.imul(t ^ (t >>> 7), 61 | t)) ^ t;
    return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
  };
}

/** Messages whose words come from their queue's ten with probability `purity`, else from thirty that all share. */
function invent(count: number, seed: number, purity: number, epoch = 2900, firstWord = 0): FoldedMessage[] {
  const random = seeded(seed);
  return Array.from({ length: count }, () => {
    const k = Math.floor(random() * queueNames.length);
    const words = new Set<number>();
    for (let i = 0; i < 8; i++) {
      words.add(
        random() < purity ? firstWord + 100 * (k + 1) + Math.floor(random() * 10) : Math.floor(random() * 30),
      );
    }
    const tokens = Float64Array.from(words).sort();
    const features: Features = {
      schema: schema.id,
      slots: [2, 2],
      regions: [new Float64Array(0), tokens, tokens.map((t) => t + 5000)],
    };
    return { features, queue: queueNames[k], epoch };
  });
}
const entryOf = ({ features, queue, epoch }: FoldedMessage): Entry => ({
  features,
  said: null,
  minus: null,
  plus: { queue, epoch },
});
const countsOf = (messages: readonly FoldedMessage[]) =>
  foldEntries(emptyCounts(schema), messages.map(entryOf));
const plain = { halfLifeDays: null };

function lossOf(
  messages: readonly FoldedMessage[],
  learned: readonly FoldedMessage[],
  fit = defaultFit(schema),
): number {
  const scorer = createScorer(serve(countsOf(learned), fit, plain), [], queueNames, null);
  const losses = messages.map(
    ({ features, queue }) => -posteriorOf(scorer, features).logProb[queueNames.indexOf(queue)],
  );
  return losses.reduce((a, b) => a + b) / losses.length;
}

describe('fitted exponents', () => {
  const learned = invent(300, 1, 0.25);
  const fit = fitTable(countsOf(learned), learned, defaultFit(schema), plain);

  test('lower the log loss of messages never seen, which leave-one-out foretells', () => {
    const unseen = invent(600, 2, 0.25);
    const before = lossOf(unseen, learned);
    const after = lossOf(unseen, learned, fit);
    expect(after).toBeLessThan(before);
    expect(Math.abs((fit.logLoss as number) - after)).toBeLessThan(0.1);
    expect(fit.messages).toBe(300);
  });

  test('are not negative, finite, and the same each time', () => {
    for (const block of fit.blocks) {
      for (const w of [block.exponent, ...Object.values(block.byQueue)])
        expect(w >= 0 && Number.isFinite(w)).toBe(true);
    }
    expect(fitTable(countsOf(learned), learned, defaultFit(schema), plain)).toEqual(fit);
  });

  test('stay near the last ones where there are few messages', () => {
    const few = invent(6, 3, 0.25);
    const barely = fitTable(countsOf(few), few, defaultFit(schema), plain);
    barely.blocks.forEach((block, b) => {
      expect(Math.abs(block.exponent - defaultFit(schema).blocks[b].exponent)).toBeLessThan(0.25);
    });
  });

  test('nothing to fit leaves the exponents as they were', () => {
    const { blocks, logLoss } = fitTable(emptyCounts(schema), [], defaultFit(schema), plain);
    expect(blocks).toEqual(defaultFit(schema).blocks);
    expect(logLoss).toBeNull();
  });
});

describe('confirmations that all others contradict', () => {
  test('are found, least likely first, and no others', () => {
    const messages = invent(300, 4, 0.8);
    const wrong = [57, 120, 251];
    const mislabelled = messages.map((m, i) =>
      wrong.includes(i) ? { ...m, queue: queueNames[(queueNames.indexOf(m.queue) + 1) % 3] } : m,
    );
    const { contradictions } = fitFindings(countsOf(mislabelled), mislabelled, defaultFit(schema), plain);
    expect(contradictions.map((c) => c.index).sort((a, b) => a - b)).toEqual(wrong);
    for (const { index, likelier, probability } of contradictions) {
      expect(likelier).toBe(messages[index].queue);
      expect(probability).toBeLessThan(0.01);
    }
  });

  test('the only message of its queue is not one of them', () => {
    const messages = [...invent(200, 5, 0.6), { ...invent(1, 6, 0.6)[0], queue: 'new' }];
    const { contradictions } = fitFindings(countsOf(messages), messages, defaultFit(schema), plain);
    expect(contradictions).toEqual([]);
  });
});

describe('exponents of scores by hand', () => {
  // One block, two queues, score 1 for queue 0 and 0 for queue 1; 3 of 4 messages belong to queue 0.
  const scores: LabelledScores = {
    messages: 4,
    queues: 2,
    blocks: 1,
    x: Float32Array.from([1, 0, 1, 0, 1, 0, 1, 0]),
    truth: Uint32Array.of(0, 0, 0, 1),
  };
  const none = { shared: 0, queue: 0, bias: 1 };

  test('the shared exponent makes the posterior the share: e^w/(e^w + 1) = 3/4 at w = log 3', () => {
    expect(fitShared(scores, Float64Array.of(0.5), none)[0]).toBeCloseTo(Math.log(3), 5);
  });

  test('is held at zero where the score misleads', () => {
    const misleading = { ...scores, truth: Uint32Array.of(1, 1, 1, 0) };
    expect(fitShared(misleading, Float64Array.of(0.5), none)[0]).toBe(0);
  });

  test('shrinkage pulls towards before', () => {
    const w = fitShared(scores, Float64Array.of(0.5), { ...none, shared: 1e6 })[0];
    expect(w).toBeCloseTo(0.5, 4);
  });

  test("queues' own exponents and biases lower the loss further", () => {
    const shared = Float64Array.of(0.5);
    const { logs } = fitQueues(scores, shared, { shared: 0, queue: 0.01, bias: 0.01 });
    // At w = 0.5: p = e^0.5/(e^0.5 + 1) = 0.6225; loss = -(3 log 0.6225 + log 0.3775)/4 = 0.5991. At 3/4: 0.5623.
    expect(meanLoss(scores, logs)).toBeLessThan(0.57);
    expect(meanLoss(scores, logs)).toBeGreaterThan(0.5623);
  });
});

test('the minimiser stops at bounds and finds the bottom of a bowl', () => {
  // (x - 1)² + (y + 2)² + xy over x, y ≥ 0: y is held at 0, so x = 1.
  const { w } = minimise(
    ([x, y]) => ({
      value: (x - 1) ** 2 + (y + 2) ** 2 + x * y,
      gradient: Float64Array.of(2 * (x - 1) + y, 2 * (y + 2) + x),
      hessian: Float64Array.of(2, 1, 1, 2),
    }),
    Float64Array.of(5, 5),
    Float64Array.of(0, 0),
    20,
  );
  expect(w[0]).toBeCloseTo(1, 6);
  expect(w[1]).toBe(0);
});

describe('the served table', () => {
  // Every message brings words of its own, so that the table outgrows its bound by far.
  const random = seeded(60);
  const hash = () => Math.floor(random() * 2 ** 20) * 2 ** 20 + Math.floor(random() * 2 ** 20);
  const messages = Array.from({ length: 20_000 }, (_, i): FoldedMessage => {
    const own = Float64Array.from({ length: 16 }, hash).sort();
    const word = Float64Array.of(i % 30, 100 * ((i % 3) + 1) + (i % 10)).sort();
    return {
      features: { schema: schema.id, slots: [2, 2], regions: [new Float64Array(0), word, own] },
      queue: queueNames[i % 3],
      epoch: 2900 + (i % 20),
    };
  });
  const counts = countsOf(messages);
  const hold = fitTable(counts, [], defaultFit(schema), plain).hold;
  const table = serve(counts, { ...defaultFit(schema), hold }, plain);

  test('keeps to its bound by dropping tokens seen once and not lately; totals and vocabulary stay', () => {
    expect(hold).toEqual({ seenMin: { subject: 2, word: 2, pair: 2 }, relevanceMin: 0.2, sparesNew: true });
    const bytesMax = bounds.tableBytesPerQueueMax * bounds.tableQueuesMin;
    const whole = serve(counts, defaultFit(schema), plain);
    // Unpacked, a token of 4 bytes with a cell of 1.
    expect(whole.counts.regions[2].tokens.length * 5).toBeGreaterThan(bytesMax);
    expect(encodeTable(table).length).toBeLessThan(bytesMax * 1.05);
    expect(table.vocabulary).toEqual([0, 60, 320_000]);
    expect([...table.counts.regions[2].total]).toEqual([...whole.counts.regions[2].total]);
    // The newest 8 of 20 epochs keep their new words: 20,000 · 8/20 · 16 = 128,000.
    expect(table.counts.regions[2].tokens).toHaveLength(128_000);
    expect(table.counts.regions[1].tokens).toHaveLength(60);
  });

  test('scores what it still holds exactly as before', () => {
    const message = {
      ...messages[0].features,
      regions: [new Float64Array(0), messages[0].features.regions[1], new Float64Array(0)],
    };
    const scorers = [table, serve(counts, defaultFit(schema), plain)].map((t) =>
      createScorer(t, [], queueNames, null),
    );
    const [pruned, whole] = scorers.map((scorer) => posteriorOf(scorer, message));
    expect([...pruned.logProb]).toEqual([...whole.logProb]);
  });

  test('does not take a frequent token that was dropped for a new one', () => {
    const strict = {
      ...defaultFit(schema),
      hold: { seenMin: { word: 5000 }, relevanceMin: 0, sparesNew: false },
    };
    const strictTable = serve(counts, strict, plain);
    const dropped = messages[0].features.regions[1][1];
    expect([...strictTable.pruned[1]]).toContain(dropped);
    const later = Array.from({ length: 5 }, () => entryOf({ ...messages[0], queue: 'leaks' }));
    const scorer = createScorer(strictTable, later, queueNames, null);
    expect([...scorer.regions[1].counts.tokens]).not.toContain(dropped);
    const message = {
      ...messages[0].features,
      regions: [new Float64Array(0), Float64Array.of(dropped), new Float64Array(0)],
    };
    expect(posteriorOf(scorer, message).knownTokens).toBe(1);
  });
});

describe('ageing', () => {
  test('a queue whose words changed is told by its new words', () => {
    const old = invent(200, 7, 0.5, 2800);
    const now = invent(40, 8, 0.5, 2900, 10_000);
    const unseen = invent(200, 9, 0.5, 2900, 10_000);
    const all = [...old, ...now];
    const loss = (halfLifeDays: number | null) => {
      const scorer = createScorer(
        serve(countsOf(all), defaultFit(schema), { halfLifeDays }),
        [],
        queueNames,
        halfLifeDays,
      );
      return (
        unseen.reduce(
          (sum, m) => sum - posteriorOf(scorer, m.features).logProb[queueNames.indexOf(m.queue)],
          0,
        ) / 200
      );
    };
    expect(loss(180)).toBeLessThan(loss(null));
  });

  test('the aged table keeps Σ_v d = c to the last bit', () => {
    const all = [0, 1, 2, 3, 5, 8].flatMap((age) => invent(30, 10 + age, 0.5, 2900 - age));
    const { counts } = serve(countsOf(all), defaultFit(schema), { halfLifeDays: 9 });
    counts.columns.forEach((_, c) => {
      const sum = counts.slots[0].reduce((s, d, at) => (at % counts.columns.length === c ? s + d : s), 0);
      expect(sum).toBe(counts.messages[c]);
    });
    // 5 weeks at a half-life of 9 days: 2^(-35/9) = 0.0675; 69/1024 = 0.0674.
    const aged = serve(
      countsOf([...invent(1, 1, 0.5, 2900), ...invent(1, 1, 0.5, 2895)]),
      defaultFit(schema),
      { halfLifeDays: 9 },
    );
    expect(aged.counts.messages[0]).toBe(1 + 69 / 1024);
  });
});

describe('drift', () => {
  const steady = [0, 1, 2, 3, 4, 5].flatMap((age) => invent(40, 30 + age, 0.5, 2900 - age));

  test('none is found where nothing changed', () => {
    for (const { logFactor } of findDrift(countsOf(steady), 2)) expect(logFactor).toBeLessThan(1);
  });

  test('a queue that took up new words is first, with those words', () => {
    const changed = steady.map((m) =>
      m.queue === 'leaks' && m.epoch > 2898
        ? {
            ...m,
            features: {
              ...m.features,
              regions: [
                m.features.regions[0],
                Float64Array.from([...m.features.regions[1], 777_777]),
                m.features.regions[2],
              ],
            },
          }
        : m,
    );
    const [first] = findDrift(countsOf(changed), 2);
    expect(first).toMatchObject({ queue: 'leaks', region: 'word' });
    expect(first.logFactor).toBeGreaterThan(5);
    expect(first.tokens[0]).toMatchObject({ token: 777_777, hasRisen: true });
  });

  test('names and numbers that are new in every message are none', () => {
    let next = 1_000_000;
    const named = steady.map((m) => ({
      ...m,
      features: {
        ...m.features,
        regions: m.features.regions.map((tokens, g) =>
          g === 1 ? Float64Array.from([...tokens, next++, next++, next++]) : tokens,
        ),
      },
    }));
    for (const { logFactor } of findDrift(countsOf(named), 2)) expect(logFactor).toBeLessThan(1);
  });

  test('queues with few messages on either side are left out', () => {
    expect(findDrift(countsOf(invent(40, 50, 0.5, 2900)), 2)).toEqual([]);
  });
});
