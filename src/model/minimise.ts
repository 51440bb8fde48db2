/** A twice differentiable convex function at one point. */
export interface Point {
  readonly value: number;
  /** [parameters]. */
  readonly gradient: Float64Array;
  /** Row-major, positive semi-definite; [parameters * parameters]. */
  readonly hessian: Float64Array;
}

/** Least value of a convex function over w ≥ lower: Newton's method on the coordinates that are free (not held at their bound
 *  by the gradient), the step shortened until the value falls. Deterministic. For a few dozen parameters, whose Hessian costs
 *  little, so that a handful of steps suffice.
 *  Source: Bertsekas, Projected Newton methods for optimization problems with simple constraints, SIAM J. Control 20 (1982). */
export function minimise(
  evaluate: (w: Float64Array) => Point,
  start: Float64Array,
  lower: Float64Array,
  stepsMax: number,
): { readonly w: Float64Array; readonly value: number; readonly steps: number } {
  let w: Float64Array = start.map((x, i) => Math.max(lower[i], x));
  let point = evaluate(w);
  for (let steps = 0; ; steps++) {
    const free = [...w.keys()].filter((i) => w[i] > lower[i] || point.gradient[i] < 0);
    const slope = Math.max(0, ...free.map((i) => Math.abs(point.gradient[i])));
    if (slope < 1e-6 * (1 + Math.abs(point.value)) || steps === stepsMax)
      return { w, value: point.value, steps };
    const direction = newtonDirection(point, free, w.length);
    let next: { w: Float64Array; point: Point } | null = null;
    for (let scale = 1; scale > 1e-6 && next === null; scale /= 2) {
      const candidate = w.map((x, i) => Math.max(lower[i], x + scale * direction[i]));
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

/** -H⁻¹g on the free coordinates, 0 elsewhere, by Cholesky's factors; a ridge keeps flat directions finite. */
function newtonDirection({ gradient, hessian }: Point, free: readonly number[], size: number): Float64Array {
  const n = free.length;
  const lower = new Float64Array(n * n);
  const ridge = 1e-9 * (1 + Math.max(...free.map((i) => hessian[i * size + i])));
  for (let r = 0; r < n; r++) {
    for (let c = 0; c <= r; c++) {
      let sum = hessian[free[r] * size + free[c]] + (r === c ? ridge : 0);
      for (let i = 0; i < c; i++) sum -= lower[r * n + i] * lower[c * n + i];
      lower[r * n + c] = r === c ? Math.sqrt(Math.max(sum, ridge)) : sum / lower[c * n + c];
    }
  }
  const x = Float64Array.from(free, (i) => -gradient[i]);
  for (let r = 0; r < n; r++) {
    for (let i = 0; i < r; i++) x[r] -= lower[r * n + i] * x[i];
    x[r] /= lower[r * n + r];
  }
  for (let r = n - 1; r >= 0; r--) {
    for (let i = r + 1; i < n; i++) x[r] -= lower[i * n + r] * x[i];
    x[r] /= lower[r * n + r];
  }
  const direction = new Float64Array(size);
  free.forEach((i, f) => {
    direction[i] = x[f];
  });
  return direction;
}
