import { describe, expect, it } from 'vitest';
import {
  calibrationBins,
  calibrationError,
  measure,
  type Outcome,
  routedShareAt,
  routingCurve,
  thinCurve,
  wilsonInterval,
} from '../../src/cli/replay/metrics.ts';

const outcome = (top: number, isRight: boolean, trueProbability = isRight ? top : 0): Outcome => ({
  top,
  isRight,
  trueProbability,
});

const four = [outcome(0.9, true), outcome(0.8, true), outcome(0.7, false, 0.2), outcome(0.6, true)];

describe('measures', () => {
  it('of four messages, by hand', () => {
    const measures = measure(four);
    expect(measures.accuracy).toBe(0.75);
    // -(ln 0.9 + ln 0.8 + ln 0.2 + ln 0.6) / 4
    // = (0.105360516 + 0.223143551 + 1.609437912 + 0.510825624) / 4 = 2.448767603 / 4
    expect(measures.logLoss).toBeCloseTo(0.6121919, 7);
    // Bins of a fifteenth: 0.9 in 13, 0.8 in 12, 0.7 in 10, 0.6 in 9: each alone.
    // (|0.9-1| + |0.8-1| + |0.7-0| + |0.6-1|) / 4 = 1.4 / 4
    expect(measures.calibrationError).toBeCloseTo(0.35, 12);
    // Precision 1, 1, 2/3, 3/4: the first two of four.
    expect(measures.routedAt95).toBe(0.5);
  });
  it('clip a probability of nought at 1e-15', () => {
    // -ln 1e-15 = 15 ln 10 = 34.538776395
    expect(measure([outcome(1, false)]).logLoss).toBeCloseTo(34.538776395, 8);
  });
  it('of no message are nought', () => {
    expect(measure([])).toEqual({
      accuracy: 0,
      accuracyInterval: [0, 1],
      logLoss: 0,
      calibrationError: 0,
      routedAt95: 0,
    });
  });
});

describe('calibration', () => {
  it('puts a posterior of exactly 1 into the last bin', () => {
    const bins = calibrationBins([outcome(1, true), outcome(0.95, false)], 15);
    expect(bins).toHaveLength(1);
    expect(bins[0]).toMatchObject({ messages: 2, said: 0.975, cameTrue: 0.5 });
    // |0.975 - 0.5|
    expect(calibrationError(bins)).toBeCloseTo(0.475, 12);
  });
  it('weighs bins by their messages', () => {
    // Bin 0 of 2 (0 to 0.5): three at 0.4, one right: |0.4 - 1/3| = 0.0666667 for 3/4 of all;
    // bin 1: one at 0.8, right: 0.2 for 1/4. 0.05 + 0.05
    const bins = calibrationBins(
      [outcome(0.4, true), outcome(0.4, false), outcome(0.4, false), outcome(0.8, true)],
      2,
    );
    expect(calibrationError(bins)).toBeCloseTo(0.1, 12);
  });
});

describe('the routing curve', () => {
  it('gives share and precision of every threshold', () => {
    expect(routingCurve(four)).toEqual([
      { posteriorMin: 0.9, routedShare: 0.25, precision: 1 },
      { posteriorMin: 0.8, routedShare: 0.5, precision: 1 },
      { posteriorMin: 0.7, routedShare: 0.75, precision: 2 / 3 },
      { posteriorMin: 0.6, routedShare: 1, precision: 0.75 },
    ]);
  });
  it('takes equal posteriors together', () => {
    const curve = routingCurve([outcome(0.9, true), outcome(0.9, false), outcome(0.5, true)]);
    expect(curve.map((point) => point.routedShare)).toEqual([2 / 3, 1]);
  });
  it('gives the largest share of a precision, also when the precision dipped before', () => {
    // Precisions 0/1, 1/2, 2/3, 3/4.
    const late = [outcome(0.9, false), outcome(0.8, true), outcome(0.7, true), outcome(0.6, true)];
    expect(routedShareAt(routingCurve(late), 0.75)).toBe(1);
    expect(routedShareAt(routingCurve(late), 0.8)).toBe(0);
  });
  it('is thinned to the wanted shares', () => {
    expect(thinCurve(routingCurve(four), 2).map((point) => point.routedShare)).toEqual([0.5, 1]);
    expect(thinCurve(routingCurve(four), 100)).toHaveLength(4);
  });
});

it("Wilson's interval is that of the textbook", () => {
  // Newcombe, Statistics in Medicine 17 (1998), table I, method 3: 81 of 263 gives 0.2553 to 0.3662, 0 of 20 gives 0 to 0.1611.
  const [low, high] = wilsonInterval(81, 263);
  expect(low).toBeCloseTo(0.2553, 4);
  expect(high).toBeCloseTo(0.3662, 4);
  expect(wilsonInterval(0, 20)[1]).toBeCloseTo(0.1611, 4);
});
