import { describe, expect, it } from 'vitest';
import { documentsOf } from '../../src/metrics/emf.ts';
import {
  type Measurement,
  measureCompaction,
  measureFolding,
  measureRecount,
  measureRouting,
  metrics,
} from '../../src/metrics/measurement.ts';

const atMs = 1772442000000; // 2026-03-02T09:00:00Z

describe('the lines of a routed batch', () => {
  const lines = [
    { event: 'routed', queue: 'billing', posterior: 0.999, message: 'a' },
    { event: 'routed', queue: 'billing', posterior: 0.95, message: 'b' },
    { event: 'guarded', queue: 'leaks', posterior: 0.2, message: 'c' },
    { event: 'held', queue: 'moving', posterior: 0.9499, reason: 'unsure' },
    { event: 'held', queue: null, posterior: 0, reason: 'nothing-learned' },
    { event: 'held', queue: 'moving', posterior: 0.4999, reason: 'unsure' },
    { event: 'decided-already' },
    { event: 'route-failed', code: 'store-unavailable' },
  ];

  it('are counted by what became of each, by band of the probability stated, and by queue', () => {
    expect(measureRouting(lines, ['billing', 'leaks', 'moving'], 7)).toEqual([
      {
        queue: null,
        values: {
          Routed: [2],
          Held: [3],
          Guarded: [1],
          PosteriorBelow50: [1],
          PosteriorFrom80: [1],
          PosteriorFrom95: [1],
          PosteriorFrom99: [1],
          SegmentsWaiting: [7],
        },
      },
      { queue: 'billing', values: { ToQueue: [2] } },
      { queue: 'leaks', values: { ToQueue: [1] } },
    ]);
  });

  it('of nothing say zero, so that a rate has a denominator, and no level that is not known', () => {
    expect(measureRouting([], ['billing'], null)).toEqual([
      { queue: null, values: { Routed: [0], Held: [0], Guarded: [0] } },
    ]);
  });

  it('tell at most 20 queues apart, the rest together', () => {
    const ids = Array.from({ length: 50 }, (_, i) => `queue-${i}`);
    const measured = measureRouting(
      ids.map((queue) => ({ event: 'routed', queue, posterior: 1 })),
      ids,
      null,
    );
    const queues = measured.flatMap(({ queue }) => queue ?? []);
    expect(queues).toEqual([...ids.slice(0, 20), '(others)']);
    expect(measured.at(-1)!.values).toEqual({ ToQueue: [30] });
  });
});

describe('the lines of a folded batch', () => {
  it('give counts, and the time from each confirmation to its fold; a clock ahead is no negative time', () => {
    const lines = [
      { event: 'confirmation-folded', lagMs: 2500 },
      { event: 'confirmation-folded', lagMs: -40 },
      // Of an archive: no lag was told.
      { event: 'confirmation-folded' },
      { event: 'confirmation-already' },
      { event: 'confirmation-refused' },
    ];
    expect(measureFolding(lines)).toEqual([
      { queue: null, values: { Folded: [3], Refused: [1], FoldLagSeconds: [2.5, 0] } },
    ]);
  });
});

describe('a compaction', () => {
  const sizes = { messages: 12, cells: 340, baseBytes: 5000, tableBytes: 3000 };

  it('tells its duration and the sizes of what it made', () => {
    expect(measureCompaction({ kind: 'compacted', ...sizes }, 1250)).toEqual([
      {
        queue: null,
        values: {
          Compactions: [1],
          CompactionSeconds: [1.25],
          SegmentsWaiting: [0],
          MessagesCounted: [12],
          Cells: [340],
          BaseBytes: [5000],
          TableBytes: [3000],
        },
      },
    ]);
  });

  it('that made nothing tells no sizes, which would read as an empty table', () => {
    const nothing = { kind: 'nothing-new', messages: 0, cells: 0, baseBytes: 0, tableBytes: 0 };
    expect(measureCompaction(nothing, 80)).toEqual([
      { queue: null, values: { Compactions: [1], CompactionSeconds: [0.08] } },
    ]);
  });
});

describe('a recount', () => {
  it.each([
    ['that agrees is 0', { differences: 0, fault: null }, 0],
    ['that differs is the number of cells', { differences: 3, fault: null }, 3],
    ['of a table that cannot be read is 1', { differences: 0, fault: { code: 'object-damaged' } }, 1],
  ])('%s', (_title, result, differences) => {
    expect(measureRecount(result)).toEqual([{ queue: null, values: { RecountDifferences: [differences] } }]);
  });
});

describe('embedded metric format', () => {
  it('is one document for the desk and one for each queue, counts added, levels last, `_aws` at the root', () => {
    const measurements: Measurement[] = [
      { queue: null, values: { Failed: [0], SegmentsWaiting: [4] } },
      { queue: null, values: { Failed: [2], SegmentsWaiting: [5], FoldLagSeconds: [1.5, 3] } },
      { queue: 'billing', values: { ToQueue: [2] } },
      { queue: 'billing', values: { ToQueue: [1] } },
    ];
    expect(documentsOf(measurements, 'fenmark-mail', atMs)).toEqual([
      {
        _aws: {
          Timestamp: 1772442000000,
          CloudWatchMetrics: [
            {
              Namespace: 'Tallypost',
              Dimensions: [['Desk']],
              Metrics: [
                { Name: 'Failed', Unit: 'Count' },
                { Name: 'SegmentsWaiting', Unit: 'Count' },
                { Name: 'FoldLagSeconds', Unit: 'Seconds' },
              ],
            },
          ],
        },
        Desk: 'fenmark-mail',
        Failed: 2,
        SegmentsWaiting: 5,
        FoldLagSeconds: [1.5, 3],
      },
      {
        _aws: {
          Timestamp: 1772442000000,
          CloudWatchMetrics: [
            {
              Namespace: 'Tallypost',
              Dimensions: [['Desk', 'Queue']],
              Metrics: [{ Name: 'ToQueue', Unit: 'Count' }],
            },
          ],
        },
        Desk: 'fenmark-mail',
        Queue: 'billing',
        ToQueue: 3,
      },
    ]);
  });

  it('holds at most 100 values of one metric: more go into further documents, each once', () => {
    const lags = Array.from({ length: 250 }, (_, i) => i);
    const documents = documentsOf(
      [{ queue: null, values: { Folded: [250], FoldLagSeconds: lags } }],
      'd',
      atMs,
    );
    expect(documents.map((one) => (one.FoldLagSeconds as number[]).length)).toEqual([100, 100, 50]);
    expect(documents.flatMap((one) => one.FoldLagSeconds)).toEqual(lags);
    expect(documents.map((one) => one.Folded)).toEqual([250, undefined, undefined]);
  });

  it('writes nothing when nothing was measured, and no metric without a value', () => {
    expect(documentsOf([], 'd', atMs)).toEqual([]);
    expect(documentsOf([{ queue: null, values: { FoldLagSeconds: [] } }], 'd', atMs)).toEqual([]);
  });

  it('keeps within the format’s limits with all metrics at once', () => {
    const values = Object.fromEntries(Object.keys(metrics).map((name) => [name, [1]]));
    const [document] = documentsOf([{ queue: null, values }], `bucket/ü ${'x'.repeat(600)}`, atMs);
    const directive = (document!._aws as { CloudWatchMetrics: { Metrics: unknown[] }[] })
      .CloudWatchMetrics[0]!;
    // At most 100 definitions in a directive, dimension values of 1 to 1,024 ASCII characters.
    expect(directive.Metrics.length).toBe(Object.keys(metrics).length);
    expect(directive.Metrics.length).toBeLessThanOrEqual(100);
    expect(document!.Desk).toMatch(/^bucket\/\?\?x{246}$/);
    expect(JSON.stringify(document)).not.toContain('\n');
  });
});
