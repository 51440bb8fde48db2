import { exponentOf } from './fit.ts';
import type { Own } from './hits.ts';
import type { Scorer } from './scorer.ts';

type Counted = Pick<Scorer, 'schema' | 'queues' | 'fit' | 'messages' | 'slots'>;

/** log (α + c_k)/(K α + n); [queues]. */
export function priorScore(scorer: Counted, own: Own | null): Float64Array {
  const { alpha } = scorer.fit;
  const c = countsWithout(scorer.messages, own);
  const whole = c.reduce((sum, n) => sum + alpha + n, 0);
  return c.map((n) => Math.log((alpha + n) / whole));
}

/** log (β + d_jk(v))/(N_j β + c_k), the posterior predictive of slot j's value v under a symmetric Dirichlet prior; [queues].
 *  Source: Murphy, Machine Learning (2012), section 3.4. */
export function slotScore(scorer: Counted, slot: number, value: number, own: Own | null): Float64Array {
  const queues = scorer.queues.length;
  const { id, values } = scorer.schema.slots[slot];
  const beta = scorer.fit.beta[id] ?? 1;
  const d = countsWithout(scorer.slots[slot].subarray(value * queues, (value + 1) * queues), own);
  const c = countsWithout(scorer.messages, own);
  return d.map((n, k) => Math.log((beta + n) / (values.length * beta + c[k])));
}

function countsWithout(counts: Float64Array, own: Own | null): Float64Array {
  if (own === null) return counts;
  const less = counts.slice();
  less[own.queue] -= own.weight;
  return less;
}

/** All that prior and slots can add to a log posterior, exponents included: a score then only picks it. */
export function closedScores(scorer: Counted): Pick<Scorer, 'priorScores' | 'slotScores'> {
  const { schema, queues, fit } = scorer;
  const priorScores = Float64Array.from(queues, (queue) => fit.bias[queue] ?? 0);
  const slotScores = schema.slots.map(({ values }) => new Float64Array(values.length * queues.length));
  const add = (sum: Float64Array, at: number, exponents: Float64Array, score: Float64Array) => {
    for (let k = 0; k < queues.length; k++) sum[at + k] += exponents[k] * score[k];
  };
  for (const block of fit.blocks) {
    const exponents = Float64Array.from(queues, (queue) => exponentOf(block, queue));
    if (block.kind === 'prior') add(priorScores, 0, exponents, priorScore(scorer, null));
    if (block.kind !== 'slots') continue;
    schema.slots.forEach((slot, j) => {
      if (slot.group !== block.group) return;
      for (let v = 0; v < slot.values.length; v++) {
        add(slotScores[j], v * queues.length, exponents, slotScore(scorer, j, v, null));
      }
    });
  }
  return { priorScores, slotScores };
}
