import { describe, expect, it } from 'vitest';
import { bandEdges, recordBands } from '../../src/model/record.ts';
import { countCorrections } from '../../src/report/corrections.ts';
import { weighDrift } from '../../src/report/drift.ts';
import { estimate } from '../../src/report/estimate.ts';
import { findNewQueues, type HeldMessage } from '../../src/report/new-queue.ts';
import { readPromises } from '../../src/report/promises.ts';
import { weighRouting } from '../../src/report/routing.ts';
import type { Seen } from '../../src/report/seen.ts';
import { countVolume } from '../../src/report/volume.ts';

let made = 0;
function seen(part: Partial<Seen> & { said?: string }): Seen {
  made += 1;
  return {
    message: `m${String(made).padStart(5, '0')}`,
    atMs: Date.UTC(2026, 0, 5),
    kind: 'routed',
    queue: 'billing',
    posterior: 0.9,
    confirmed: part.said === undefined ? null : { queue: part.said, by: 'a', at: '2026-01-05T10:00:00Z' },
    isRevised: false,
    ...part,
  };
}

describe('a share with its interval', () => {
  it('has Wilson’s bounds: 10 of 10 cannot be below 72 %, 0 of 10 not above 28 %', () => {
    // Wilson 1927 at z = 1.96: 10/10 gives 0.7225, the mirror image gives 0.2775.
    expect(estimate(10, 10).low).toBeCloseTo(0.7225, 4);
    expect(estimate(10, 10).high).toBeCloseTo(1, 12);
    expect(estimate(0, 10).high).toBeCloseTo(0.2775, 4);
    // Newcombe, Statistics in Medicine 17 (1998), table I, method 3: 81 of 263 gives 0.2553 to 0.3662.
    expect(estimate(81, 263).low).toBeCloseTo(0.2553, 4);
    expect(estimate(81, 263).high).toBeCloseTo(0.3662, 4);
  });

  it('of nothing is unknown', () => {
    expect(estimate(0, 0)).toEqual({ hits: 0, of: 0, share: null, low: 0, high: 1 });
  });
});

describe('promises', () => {
  const record = (fill: Record<number, [number, number, number, number]>) => {
    const all = new Float64Array(recordBands * 4);
    for (const [band, four] of Object.entries(fill)) all.set(four, 4 * Number(band));
    return all;
  };

  it('joins neighbouring bands until each holds 30 and keeps the edges', () => {
    const { bands } = readPromises(record({ 2: [5, 5, 0, 0], 3: [12, 10, 0, 0], 9: [90, 10, 0, 0] }));
    const edges = bandEdges();
    expect(bands.map(({ from, to, cameTrue }) => [from, to, cameTrue.hits, cameTrue.of])).toEqual([
      [0, edges[4], 17, 32],
      [edges[4], edges[10], 90, 100],
    ]);
  });

  it('calls a promise broken only when the whole interval lies outside of what was said', () => {
    const edges = bandEdges(); // band 8 reaches from 0.953 to 0.977, band 5 from 0.679 to 0.818
    expect([edges[5], edges[6], edges[8], edges[9]].map((edge) => edge?.toFixed(3))).toEqual([
      '0.679',
      '0.818',
      '0.953',
      '0.977',
    ]);
    const verdicts = (band: number, hits: number, misses: number) =>
      readPromises(record({ [band - 1]: [0, 30, 0, 0], [band]: [hits, misses, 0, 0] })).bands.at(-1)?.verdict;
    expect(verdicts(8, 80, 20)).toBe('too-high'); // 80 % came true of 95 % said
    expect(verdicts(5, 74, 26)).toBe('kept');
    expect(verdicts(5, 99, 1)).toBe('too-low');
  });

  it('counts messages drawn for a look on their own', () => {
    const { audit, bands } = readPromises(record({ 9: [90, 10, 19, 1] }));
    expect([audit.hits, audit.of]).toEqual([19, 20]);
    expect(bands[0]?.cameTrue.of).toBe(120);
  });
});

describe('routing weighed', () => {
  const costs = { lookMinutes: 2, wrongRouteMinutes: (queue: string) => (queue === 'careers' ? 45 : 15) };

  it('adds minutes by the desk’s costs and finds the cheapest limit', () => {
    const all = [
      seen({ posterior: 0.99, said: 'billing' }),
      seen({ posterior: 0.98, said: 'billing' }),
      seen({ posterior: 0.95, queue: 'careers', said: 'billing' }), // wrong: 45 minutes
      seen({ posterior: 0.9, kind: 'held', said: 'billing' }),
      seen({ posterior: 0.5, kind: 'held', said: 'careers' }),
      seen({ posterior: 0.4, kind: 'held' }), // nobody said
      seen({ kind: 'guarded', said: 'billing' }),
    ];
    const { judged, today, cheapest, minutesPer1000, curve } = weighRouting(all, costs);
    expect(judged).toBe(5);
    expect(today.share).toBeCloseTo(3 / 5, 12);
    expect([today.right.hits, today.right.of]).toEqual([2, 3]);
    // A look at each: 5 * 2 = 10. Today: 45 + 2 looks * 2 = 49. Best: the first two routed, 3 looks = 6.
    expect(minutesPer1000).toEqual({ lookAtEach: 2000, today: 9800, cheapest: 1200 });
    expect(cheapest).toEqual({ share: 2 / 5, right: 1, probability: 0.98 });
    expect(curve.map((point) => point.right)).toEqual([1, 1, 2 / 3, 3 / 4, 3 / 5]);
  });

  it('says nothing where nothing is confirmed', () => {
    expect(weighRouting([seen({})], costs)).toEqual({
      judged: 0,
      curve: [],
      today: { share: 0, right: estimate(0, 0) },
      cheapest: null,
      minutesPer1000: null,
    });
  });
});

describe('corrections', () => {
  it('counts from where to where, most frequent first, routed and held apart', () => {
    const counted = countCorrections([
      seen({ said: 'moving-home' }),
      seen({ said: 'moving-home', kind: 'held' }),
      seen({ said: 'careers', kind: 'held', isRevised: true }),
      seen({ said: 'billing' }),
      seen({ said: 'careers', kind: 'guarded' }),
    ]);
    expect(counted).toEqual({
      pairs: [
        { from: 'billing', to: 'moving-home', routed: 1, held: 1 },
        { from: 'billing', to: 'careers', routed: 0, held: 1 },
      ],
      routedWrong: 1,
      heldWrong: 2,
      revised: 1,
    });
  });
});

describe('volume', () => {
  it('steps by day for five weeks and by week from Monday for more', () => {
    const at = (month: number, day: number, kind: Seen['kind'] = 'routed') =>
      seen({ atMs: Date.UTC(2026, month, day, 23), kind });
    const days = countVolume([at(0, 5), at(0, 6, 'held'), at(0, 6)]);
    expect(days.step).toBe('day');
    expect(days.steps.map((step) => [step.from.slice(0, 10), step.routed, step.held])).toEqual([
      ['2026-01-05', 1, 0],
      ['2026-01-06', 1, 1],
    ]);
    const weeks = countVolume([at(0, 11), at(0, 12), at(1, 20, 'guarded')]);
    expect(weeks.step).toBe('week');
    expect(weeks.steps[0]?.from.slice(0, 10)).toBe('2026-01-05'); // a Monday
    expect(weeks.steps.map((step) => step.routed + step.guarded)).toEqual([1, 1, 0, 0, 0, 0, 1]);
  });
});

describe('drift', () => {
  it('is the sum of Bayes factors under Beta(½, ½), each token changed with probability 0.01', () => {
    // One token: in 0 of 2 messages before, in 4 of 4 since. With B(k, n) = B(k + ½, n - k + ½)/B(½, ½):
    // B(0, 2) = 3/8, B(4, 4) = 35/128, B(4, 6) = (½·3/2·5/2·7/2)(½·3/2)/720 = (105/16)(3/4)/720 = 7/1024.
    const factor = ((3 / 8) * (35 / 128)) / (7 / 1024);
    const { nats, risen } = weighDrift({
      earlierMessages: 2,
      recentMessages: 4,
      earlier: new Map(),
      recent: new Map([[7, 4]]),
    });
    expect(nats).toBeCloseTo(Math.log(0.99 + 0.01 * factor), 12);
    expect(risen).toEqual([7]);
  });

  it('stays small where only chance differs', () => {
    const earlier = new Map(Array.from({ length: 500 }, (_, t) => [t, 40 + (t % 7)]));
    const recent = new Map(Array.from({ length: 500 }, (_, t) => [t, 10 + (t % 3)]));
    const { nats } = weighDrift({ earlierMessages: 200, recentMessages: 50, earlier, recent });
    expect(nats).toBeLessThan(0);
  });
});

describe('a new queue among held messages', () => {
  // Tokens 0-9 belong to queue 0, 10-19 to queue 1; 90-94 were never counted.
  const counts = new Map<number, Float64Array>();
  for (let t = 0; t < 10; t += 1) counts.set(t, Float64Array.of(50, 1));
  for (let t = 10; t < 20; t += 1) counts.set(t, Float64Array.of(1, 50));
  const present = { messages: Float64Array.of(100, 100), counts };
  const group = (prefix: string, size: number, tokens: (i: number) => number[]): HeldMessage[] =>
    Array.from({ length: size }, (_, i) => ({ message: `${prefix}${i}`, tokens: tokens(i) }));

  it('finds the messages that share words of their own and leaves the others alone', () => {
    const visits = group('visit', 8, (i) => [90, 91, 92, i, 93 + (i % 2)]);
    const known = group('known', 10, (i) => [0, 1, 2, 3, 4, 5, 6, 7].filter((t) => (t + i) % 3 !== 0));
    const found = findNewQueues([...visits, ...known], present);
    expect(found).toHaveLength(1);
    expect([...(found[0]?.messages ?? [])].sort()).toEqual(visits.map((each) => each.message));
    expect(found[0]?.tokens.slice(0, 3).sort()).toEqual([90, 91, 92]);
    expect(found[0]?.nats).toBeGreaterThan(20);
  });

  it('proposes none for what the present queues explain, nor for fewer than five', () => {
    expect(
      findNewQueues(
        group('known', 12, (i) => [0, 1, 2, 3, i % 10]),
        present,
      ),
    ).toEqual([]);
    expect(
      findNewQueues(
        group('few', 4, () => [90, 91, 92, 93]),
        present,
      ),
    ).toEqual([]);
    expect(findNewQueues([], present)).toEqual([]);
  });
});
