import { exponentOf, type SlotsBlock } from './fit.ts';
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

/** log (β_j(v) + d_jk(v))/(N_j β_j + c_k), the posterior predictive of slot j's value v under a Dirichlet prior; [queues]. With an
 *  even base β_j(v) = β_j. With the pooled one β_j(v) = N_j β_j m_v, m_v the value's share among all messages: a queue
 *  that holds nothing yet is then taken to be like the desk, and not like a list.
 *  Source: Murphy, Machine Learning (2012), section 3.4; Minka, Estimating a Dirichlet distribution (2000), section 1. */
export function slotScore(
  scorer: Counted,
  slot: number,
  value: number,
  own: Own | null,
  base: SlotsBlock['base'],
): Float64Array {
  const queues = scorer.queues.length;
  const { id, values } = scorer.schema.slots[slot];
  const whole = values.length * (scorer.fit.beta[id] ?? 1);
  const d = countsWithout(scorer.slots[slot].subarray(value * queues, (value + 1) * queues), own);
  const c = countsWithout(scorer.messages, own);
  const share = base === 'pooled' ? pooledShare(d, c, values.length) : 1 / values.length;
  return d.map((n, k) => Math.log((whole * share + n) / (whole + c[k])));
}

/** m_v = (D_v + ½)/(n + ½N). */
export function pooledShare(held: ArrayLike<number>, messages: ArrayLike<number>, values: number): number {
  const sum = (counts: ArrayLike<number>) =>
    Array.prototype.reduce.call(counts, (a, b) => (a as number) + (b as number), 0) as number;
  return (sum(held) + 0.5) / (sum(messages) + 0.5 * values);
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
        add(slotScores[j], v * queues.length, exponents, slotScore(scorer, j, v, null, block.base));
      }
    });
  }
  return { priorScores, slotScores };
}
