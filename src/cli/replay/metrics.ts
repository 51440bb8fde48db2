/** One message that was predicted and whose queue is known. */
export interface Outcome {
  /** Posterior of the likeliest queue, 0 to 1. */
  readonly top: number;
  /** The likeliest queue is the true one. */
  readonly isRight: boolean;
  /** Posterior of the true queue, 0 to 1; 0 when the desk does not have that queue. */
  readonly trueProbability: number;
}

export interface Measures {
  /** Share whose likeliest queue is the true one, with its 95 % interval (Wilson 1927). */
  readonly accuracy: number;
  readonly accuracyInterval: readonly [number, number];
  /** Mean of -ln P(true queue), nats, P clipped at 1e-15. */
  readonly logLoss: number;
  /** Expected calibration error over 15 equal bins of the top posterior. */
  readonly calibrationError: number;
  /** Largest share whose top posteriors reach 95 % precision. */
  readonly routedAt95: number;
}

/** Point of the curve of share routed against precision. */
export interface CurvePoint {
  /** Smallest top posterior among those routed. */
  readonly posteriorMin: number;
  readonly routedShare: number;
  readonly precision: number;
}

export interface CalibrationBin {
  readonly from: number;
  readonly to: number;
  readonly messages: number;
  /** Mean top posterior of the bin. */
  readonly said: number;
  /** Share of the bin that was right, and its 95 % interval. */
  readonly cameTrue: number;
  readonly interval: readonly [number, number];
}

const probabilityMin = 1e-15;
const binsCount = 15;

export function measure(outcomes: readonly Outcome[]): Measures {
  const n = outcomes.length;
  let right = 0;
  let loss = 0;
  for (const outcome of outcomes) {
    if (outcome.isRight) right += 1;
    loss -= Math.log(Math.max(outcome.trueProbability, probabilityMin));
  }
  return {
    accuracy: n === 0 ? 0 : right / n,
    accuracyInterval: wilsonInterval(right, n),
    logLoss: n === 0 ? 0 : loss / n,
    calibrationError: calibrationError(calibrationBins(outcomes, binsCount)),
    routedAt95: routedShareAt(routingCurve(outcomes), 0.95),
  };
}

/** Bins of equal width over the top posterior; empty ones are left out. */
export function calibrationBins(outcomes: readonly Outcome[], bins: number): CalibrationBin[] {
  const messages = new Float64Array(bins);
  const said = new Float64Array(bins);
  const right = new Float64Array(bins);
  for (const { top, isRight } of outcomes) {
    const bin = Math.min(bins - 1, Math.floor(top * bins));
    messages[bin] += 1;
    said[bin] += top;
    if (isRight) right[bin] += 1;
  }
  return Array.from(messages, (count, bin) => ({
    from: bin / bins,
    to: (bin + 1) / bins,
    messages: count,
    said: said[bin] / count,
    cameTrue: right[bin] / count,
    interval: wilsonInterval(right[bin], count),
  })).filter((bin) => bin.messages > 0);
}

/** Σ share of messages in the bin * |said - came true|. Naeini, Cooper, Hauskrecht, AAAI 2015. */
export function calibrationError(bins: readonly CalibrationBin[]): number {
  const all = bins.reduce((sum, bin) => sum + bin.messages, 0);
  return bins.reduce((sum, bin) => sum + (bin.messages / all) * Math.abs(bin.said - bin.cameTrue), 0);
}

/** Every rule "route when the top posterior is at least x", from the strictest on. Messages of equal posterior go together:
 *  no such rule can tell them apart. */
export function routingCurve(outcomes: readonly Outcome[]): CurvePoint[] {
  const order = [...outcomes].sort((a, b) => b.top - a.top);
  const points: CurvePoint[] = [];
  let right = 0;
  order.forEach(({ top, isRight }, index) => {
    if (isRight) right += 1;
    if (index + 1 < order.length && order[index + 1].top === top) return;
    const routed = index + 1;
    points.push({ posteriorMin: top, routedShare: routed / order.length, precision: right / routed });
  });
  return points;
}

/** Largest share routable at that precision or better; 0 when there is none. */
export function routedShareAt(curve: readonly CurvePoint[], precision: number): number {
  return curve.reduce((best, point) => (point.precision >= precision ? point.routedShare : best), 0);
}

/** The curve at `points` evenly spread shares: for each wanted share the first rule that routes at least that much. */
export function thinCurve(curve: readonly CurvePoint[], points: number): CurvePoint[] {
  const thin: CurvePoint[] = [];
  for (let step = 1; step <= points; step += 1) {
    const point = curve.find(({ routedShare }) => routedShare >= step / points - 1e-12);
    if (point !== undefined && point !== thin.at(-1)) thin.push(point);
  }
  return thin;
}

/** 95 % interval of a share: E. B. Wilson, JASA 22 (1927), without continuity correction. */
export function wilsonInterval(hits: number, draws: number): [number, number] {
  if (draws === 0) return [0, 1];
  const z = 1.959963984540054;
  const share = hits / draws;
  const centre = share + (z * z) / (2 * draws);
  const reach = z * Math.sqrt((share * (1 - share)) / draws + (z * z) / (4 * draws * draws));
  const scale = 1 + (z * z) / draws;
  return [Math.max(0, (centre - reach) / scale), Math.min(1, (centre + reach) / scale)];
}
