import { minimise, type Point } from './minimise.ts';

/** Block scores of messages whose queue is known; score (i, k, b) stands at (i * queues + k) * blocks + b. */
export interface LabelledScores {
  readonly messages: number;
  readonly queues: number;
  readonly blocks: number;
  /** In single precision: a fit to a few thousand messages is not known to seven digits, and memory halves. */
  readonly x: Float32Array;
  /** Queue of each message; [messages]. */
  readonly truth: Uint32Array;
}

/** How much is already known, in nats: `shrinkage · (w - before)²` is added to the summed log loss. */
export interface Shrinkage {
  /** Shared exponents towards those before. */
  readonly shared: number;
  /** A queue's exponents towards the shared ones, and its bias towards 0. */
  readonly queue: number;
  readonly bias: number;
}

/** Posteriors below this move no sum that a step depends on. */
const negligible = 1e-7;

/** Exponents w ≥ 0, the same for all queues, that minimise the summed log loss Σ_i -log p_i(truth) with
 *  p_i ∝ exp Σ_b w_b x_ikb, plus the shrinkage towards `before`. Convex. [blocks]. */
export function fitShared(scores: LabelledScores, before: Float64Array, { shared }: Shrinkage): Float64Array {
  const evaluate = (w: Float64Array) => sharedLoss(scores, w, before, shared);
  return minimise(evaluate, before, new Float64Array(before.length), 30).w;
}

function sharedLoss(scores: LabelledScores, w: Float64Array, before: Float64Array, shrinkage: number): Point {
  const { messages, queues, blocks, x, truth } = scores;
  const gradient = new Float64Array(blocks);
  const hessian = new Float64Array(blocks * blocks);
  const mean = new Float64Array(blocks);
  const p = new Float64Array(queues);
  let value = 0;
  for (let i = 0; i < messages; i++) {
    const logs = posteriorInto(p, (k) => dot(x, (i * queues + k) * blocks, w));
    value += logs - dot(x, (i * queues + truth[i]) * blocks, w);
    mean.fill(0);
    for (let k = 0; k < queues; k++) {
      if (p[k] < negligible) continue;
      const row = (i * queues + k) * blocks;
      for (let b = 0; b < blocks; b++) {
        const px = p[k] * x[row + b];
        mean[b] += px;
        for (let c = 0; c <= b; c++) hessian[b * blocks + c] += px * x[row + c];
      }
    }
    const row = (i * queues + truth[i]) * blocks;
    for (let b = 0; b < blocks; b++) {
      gradient[b] += mean[b] - x[row + b];
      for (let c = 0; c <= b; c++) hessian[b * blocks + c] -= mean[b] * mean[c];
    }
  }
  for (let b = 0; b < blocks; b++) {
    value += shrinkage * (w[b] - before[b]) ** 2;
    gradient[b] += 2 * shrinkage * (w[b] - before[b]);
    hessian[b * blocks + b] += 2 * shrinkage;
    for (let c = 0; c < b; c++) hessian[c * blocks + b] = hessian[b * blocks + c];
  }
  return { value, gradient, hessian };
}

/** Exponents and biases of each queue. */
export interface QueueFit {
  /** [queues * blocks]. */
  readonly exponents: Float64Array;
  /** [queues]. */
  readonly bias: Float64Array;
  /** Log posteriors before normalisation; [messages * queues]. */
  readonly logs: Float64Array;
}

/** Each queue's own exponents, shrunk to the shared ones, and its bias, shrunk to 0. Queue by queue in turn: with the others
 *  held, -log p is the loss of a logistic regression of "is it this queue" on the queue's scores, a few parameters wide; the
 *  whole is convex, so the turns converge. Blocks whose shared exponent is below `exponentMin` keep it. */
export function fitQueues(
  scores: LabelledScores,
  shared: Float64Array,
  shrinkage: Shrinkage,
  { exponentMin = 0.02, turns = 4 } = {},
): QueueFit {
  const { messages, queues, blocks, x } = scores;
  const used = [...shared.keys()].filter((b) => shared[b] >= exponentMin);
  const exponents = new Float64Array(queues * blocks);
  for (let k = 0; k < queues; k++) exponents.set(shared, k * blocks);
  const bias = new Float64Array(queues);
  const logs = new Float64Array(messages * queues);
  for (let at = 0; at < logs.length; at++) logs[at] = dot(x, at * blocks, shared);
  const lower = Float64Array.from([...used.map(() => 0), -Infinity]);
  const before = Float64Array.from([...used.map((b) => shared[b]), 0]);
  const weights = Float64Array.from([...used.map(() => shrinkage.queue), shrinkage.bias]);
  for (let turn = 0; turn < turns; turn++) {
    for (let k = 0; k < queues; k++) {
      const own = exponents.subarray(k * blocks, (k + 1) * blocks);
      const start = Float64Array.from([...used.map((b) => own[b]), bias[k]]);
      const problem = queueProblem(scores, logs, k, used, start);
      const { w } = minimise((u) => queueLoss(problem, u, before, weights), start, lower, 3);
      used.forEach((b, u) => {
        own[b] = w[u];
      });
      bias[k] = w[used.length];
      for (let i = 0; i < messages; i++)
        logs[i * queues + k] = bias[k] + dot(x, (i * queues + k) * blocks, own);
    }
  }
  return { exponents, bias, logs };
}

/** One queue against all others as they stand. */
interface QueueProblem {
  /** Row-major, the last column 1 for the bias; [rows * parameters]. */
  readonly z: Float64Array;
  /** Log posterior of the queue that the parameters do not reach, less the log sum of the others'; [rows]. */
  readonly offset: Float64Array;
  readonly isTruth: Uint8Array;
}

/** Messages of which this queue holds a share that counts, or that are its own. */
function queueProblem(
  { messages, queues, blocks, x, truth }: LabelledScores,
  logs: Float64Array,
  k: number,
  used: readonly number[],
  start: Float64Array,
): QueueProblem {
  const z: number[] = [];
  const offset: number[] = [];
  const isTruth: number[] = [];
  for (let i = 0; i < messages; i++) {
    let top = -Infinity;
    for (let j = 0; j < queues; j++) if (j !== k) top = Math.max(top, logs[i * queues + j]);
    const mine = logs[i * queues + k];
    if (truth[i] !== k && mine - top < Math.log(negligible)) continue;
    let sum = 0;
    for (let j = 0; j < queues; j++) if (j !== k) sum += Math.exp(logs[i * queues + j] - top);
    let reached = start[used.length];
    used.forEach((b, u) => {
      const value = x[(i * queues + k) * blocks + b];
      z.push(value);
      reached += start[u] * value;
    });
    z.push(1);
    offset.push(mine - reached - top - Math.log(sum));
    isTruth.push(truth[i] === k ? 1 : 0);
  }
  return { z: Float64Array.from(z), offset: Float64Array.from(offset), isTruth: Uint8Array.from(isTruth) };
}

function queueLoss(
  { z, offset, isTruth }: QueueProblem,
  u: Float64Array,
  before: Float64Array,
  weights: Float64Array,
): Point {
  const size = u.length;
  const gradient = new Float64Array(size);
  const hessian = new Float64Array(size * size);
  let value = 0;
  for (let i = 0; i < offset.length; i++) {
    const odds = offset[i] + dot(z, i * size, u);
    const p = 1 / (1 + Math.exp(-odds));
    // -log p or -log (1 - p), without overflow.
    value += Math.max(odds, 0) + Math.log1p(Math.exp(-Math.abs(odds))) - (isTruth[i] ? odds : 0);
    const slope = p - isTruth[i];
    const curve = p * (1 - p);
    for (let b = 0; b < size; b++) {
      const x = z[i * size + b];
      gradient[b] += slope * x;
      for (let c = 0; c <= b; c++) hessian[b * size + c] += curve * x * z[i * size + c];
    }
  }
  for (let b = 0; b < size; b++) {
    value += weights[b] * (u[b] - before[b]) ** 2;
    gradient[b] += 2 * weights[b] * (u[b] - before[b]);
    hessian[b * size + b] += 2 * weights[b];
    for (let c = 0; c < b; c++) hessian[c * size + b] = hessian[b * size + c];
  }
  return { value, gradient, hessian };
}

/** Mean log loss of log posteriors before normalisation, nats. */
export function meanLoss({ messages, queues, truth }: LabelledScores, logs: Float64Array): number {
  const p = new Float64Array(queues);
  let sum = 0;
  for (let i = 0; i < messages; i++) {
    sum += posteriorInto(p, (k) => logs[i * queues + k]) - logs[i * queues + truth[i]];
  }
  return sum / messages;
}

/** Fills p with the posterior of logs given by queue and answers the log of their sum. */
function posteriorInto(p: Float64Array, log: (k: number) => number): number {
  let top = -Infinity;
  for (let k = 0; k < p.length; k++) {
    p[k] = log(k);
    if (p[k] > top) top = p[k];
  }
  let sum = 0;
  for (let k = 0; k < p.length; k++) {
    p[k] = Math.exp(p[k] - top);
    sum += p[k];
  }
  for (let k = 0; k < p.length; k++) p[k] /= sum;
  return top + Math.log(sum);
}

function dot(x: Float32Array | Float64Array, from: number, w: Float64Array): number {
  let sum = 0;
  for (let b = 0; b < w.length; b++) sum += w[b] * x[from + b];
  return sum;
}
