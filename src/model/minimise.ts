import { solveQP } from 'quadprog';

/** A twice differentiable convex function at one point. */
export interface Point {
  readonly value: number;
  /** [parameters]. */
  readonly gradient: Float64Array;
  /** Row-major, positive semi-definite; [parameters * parameters]. */
  readonly hessian: Float64Array;
}

/** Least value of a convex function over w ≥ lower, by sequential quadratic programming: each step goes to the least value of
 *  the second-order model within the bounds, or shorter until the value falls. Deterministic. For a few dozen parameters, whose
 *  Hessian costs little, so that a handful of steps suffice.
 *  Source: Nocedal and Wright, Numerical Optimization (2006), section 18.1; the quadratic programs by Goldfarb and Idnani's
 *  dual method (1983), from the package quadprog. */
export function minimise(
  evaluate: (w: Float64Array) => Point,
  start: Float64Array,
  lower: Float64Array,
  stepsMax: number,
): { readonly w: Float64Array; readonly value: number; readonly steps: number } {
  let w: Float64Array = start.map((x, i) => Math.max(lower[i], x));
  let point = evaluate(w);
  for (let steps = 0; ; steps++) {
    if (slopeOf(w, point, lower) < 1e-6 * (1 + Math.abs(point.value)) || steps === stepsMax)
      return { w, value: point.value, steps };
    const step = bestStep(w, point, lower);
    let next: { w: Float64Array; point: Point } | null = null;
    for (let scale = 1; scale > 1e-6 && next === null; scale /= 2) {
      const candidate = w.map((x, i) => atLeast(lower[i], x + scale * step[i]));
      const there = evaluate(candidate);
      // Armijo's rule: at least a small part of the fall that the slope promises.
      const promised = candidate.reduce((sum, x, i) => sum + point.gradient[i] * (x - w[i]), 0);
      if (there.value < point.value && there.value <= point.value + 1e-4 * promised) {
        next = { w: candidate, point: there };
      }
    }
    if (next === null) return { w, value: point.value, steps };
    ({ w, point } = next);
  }
}

/** Largest slope along a coordinate that is not held at its bound. */
function slopeOf(w: Float64Array, { gradient }: Point, lower: Float64Array): number {
  return gradient.reduce((most, g, i) => (w[i] > lower[i] || g < 0 ? Math.max(most, Math.abs(g)) : most), 0);
}

/** Where the quadratic model is least: ½ s'Hs + g's over w + s ≥ lower; a ridge keeps flat directions finite. */
function bestStep(w: Float64Array, { gradient, hessian }: Point, lower: Float64Array): number[] {
  const size = w.length;
  const indices = [...w.keys()];
  const ridge = 1e-9 * (1 + Math.max(...indices.map((i) => hessian[i * size + i])));
  const bounded = indices.filter((i) => lower[i] > -Infinity);
  // The package counts from 1.
  const from1 = <T>(values: T[]): T[] => [values[0], ...values];
  const model = indices.map((r) => from1(indices.map((c) => hessian[r * size + c] + (r === c ? ridge : 0))));
  const bounds = indices.map((i) => from1(bounded.map((b) => (b === i ? 1 : 0))));
  const { solution, message } = solveQP(
    from1(model),
    from1(indices.map((i) => -gradient[i])),
    from1(bounds),
    from1(bounded.map((i) => lower[i] - w[i])),
  );
  // A model that rounding has made indefinite: down the slope, the step shortened by what follows.
  return message === '' ? solution.slice(1) : indices.map((i) => -gradient[i]);
}

/** Rounding does not keep a parameter a hair above its bound. */
function atLeast(lower: number, x: number): number {
  return x - lower < 1e-12 ? lower : x;
}
