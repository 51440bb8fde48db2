/** Do held messages form a queue of their own? */

/** What the present queues hold of the tokens that the held messages use. */
export interface PresentQueues {
  /** c_k; [queues]. */
  readonly messages: Float64Array;
  /** d_k(t) by token; [queues]; tokens without an entry were never counted. */
  readonly counts: ReadonlyMap<number, Float64Array>;
}

export interface HeldMessage {
  readonly message: string;
  /** Distinct tokens of one region. */
  readonly tokens: readonly number[];
}

export interface LikeGroup {
  readonly messages: readonly string[];
  /** Nats: one new queue for the group against the present queues for each. */
  readonly nats: number;
  /** Most telling first. */
  readonly tokens: readonly number[];
}

/** Concentration of the prior of a token's rate, centred on its pooled rate, as in the model's presence reading. */
const concentration = 1;
/** Pseudo-count of a queue not yet seen, as of the present ones. */
const alpha = 1;
export const groupMessagesMin = 5;
/** A proposal costs a lead's attention: it must be a thousand times the likelier account. */
const natsMin = Math.log(1000);

/** Groups of held messages that one new queue each would explain better than the present queues do, strongest first.
 *
 *  Both sides are closed forms over the tokens that the held messages use. Of a new queue: the Beta-binomial evidence of
 *  each token over the group, times the Chinese restaurant prior of one more queue (Aldous 1985): its first message costs
 *  α/(n + α), later ones (j - 1)/(n + j - 1 + α). Of the present ones: for each message the mixture of its posterior
 *  predictive over queues. Groups are found by merging the two whose union gains most evidence (Heller and Ghahramani,
 *  Bayesian hierarchical clustering, ICML 2005), from single messages on. O(messages² · tokens). */
export function findNewQueues(held: readonly HeldMessage[], present: PresentQueues): LikeGroup[] {
  const rates = pooledRates(held, present);
  const groups = mergeAlike(held, rates);
  const total = present.messages.reduce((sum, c) => sum + c, 0);
  const found = groups
    .filter((group) => group.members.length >= groupMessagesMin)
    .map((group): LikeGroup => {
      const asNew = group.evidence + newQueuePrior(group.members.length, total);
      const asPresent = group.members.reduce(
        (sum, i) => sum + presentEvidence(held[i] as HeldMessage, rates, present),
        0,
      );
      return {
        messages: group.members.map((i) => (held[i] as HeldMessage).message),
        nats: asNew - asPresent,
        tokens: tellingTokens(group, rates),
      };
    });
  return found.filter((group) => group.nats > natsMin).sort((a, b) => b.nats - a.nats);
}

type Rates = ReadonlyMap<number, number>;

function pooledRates(held: readonly HeldMessage[], { messages, counts }: PresentQueues): Rates {
  const n = messages.reduce((sum, c) => sum + c, 0);
  const rates = new Map<number, number>();
  for (const { tokens } of held) {
    for (const token of tokens) {
      if (rates.has(token)) continue;
      const seen = counts.get(token)?.reduce((sum, d) => sum + d, 0) ?? 0;
      rates.set(token, (seen + 0.5) / (n + 1));
    }
  }
  return rates;
}

interface Group {
  readonly members: readonly number[];
  readonly hits: ReadonlyMap<number, number>;
  readonly evidence: number;
}

function mergeAlike(held: readonly HeldMessage[], rates: Rates): Group[] {
  const absent = absentEvidence(rates, held.length);
  const weigh = (hits: ReadonlyMap<number, number>, n: number): number => {
    let sum = absent[n] as number;
    for (const [token, k] of hits) {
      const m = rates.get(token) as number;
      sum += betaBinomial(k, n, m) - betaBinomial(0, n, m);
    }
    return sum;
  };
  const groups: (Group | null)[] = held.map(({ tokens }, i) => {
    const hits = new Map(tokens.map((token) => [token, 1]));
    return { members: [i], hits, evidence: weigh(hits, 1) };
  });
  const gains: Float64Array[] = groups.map(() =>
    new Float64Array(groups.length).fill(Number.NEGATIVE_INFINITY),
  );
  const gainOf = (a: Group, b: Group) =>
    weigh(addHits(a.hits, b.hits), a.members.length + b.members.length) - a.evidence - b.evidence;
  const fill = (i: number) => {
    groups.forEach((other, j) => {
      if (j === i || other === null) return;
      const gain = gainOf(groups[i] as Group, other);
      (gains[Math.min(i, j)] as Float64Array)[Math.max(i, j)] = gain;
    });
  };
  for (let i = 0; i < groups.length; i += 1) fill(i);
  for (;;) {
    let best = { gain: 0, i: -1, j: -1 };
    gains.forEach((row, i) => {
      if (groups[i] === null) return;
      for (let j = i + 1; j < row.length; j += 1) {
        if (groups[j] !== null && (row[j] as number) > best.gain) best = { gain: row[j] as number, i, j };
      }
    });
    if (best.i < 0) return groups.filter((group) => group !== null);
    const [a, b] = [groups[best.i] as Group, groups[best.j] as Group];
    const hits = addHits(a.hits, b.hits);
    const members = [...a.members, ...b.members];
    groups[best.i] = { members, hits, evidence: weigh(hits, members.length) };
    groups[best.j] = null;
    fill(best.i);
  }
}

function addHits(a: ReadonlyMap<number, number>, b: ReadonlyMap<number, number>): Map<number, number> {
  const sum = new Map(a);
  for (const [token, k] of b) sum.set(token, (sum.get(token) ?? 0) + k);
  return sum;
}

/** Evidence that none of n messages holds any of the tokens, by n; [0 .. held]. */
function absentEvidence(rates: Rates, held: number): Float64Array {
  const sums = new Float64Array(held + 1);
  for (const m of rates.values()) for (let n = 1; n <= held; n += 1) sums[n] += betaBinomial(0, n, m);
  return sums;
}

/** log of B(s·m + k, s·(1 - m) + n - k)/B(s·m, s·(1 - m)) for whole k and n: rising products need no gamma function. */
function betaBinomial(k: number, n: number, m: number): number {
  const [a, b] = [concentration * m, concentration * (1 - m)];
  let product = 1;
  let log = 0;
  for (let i = 0; i < n; i += 1) {
    product *= (i < k ? a + i : b + i - k) / (concentration + i);
    if (product < 1e-200) {
      log += Math.log(product);
      product = 1;
    }
  }
  return log + Math.log(product);
}

function newQueuePrior(size: number, total: number): number {
  let log = 0;
  for (let j = 0; j < size; j += 1) log += Math.log((j === 0 ? alpha : j) / (total + alpha + j));
  return log;
}

/** log Σ_k P(k) Π_t p_kt^x (1 - p_kt)^(1 - x) over the tokens that the held messages use. */
function presentEvidence({ tokens }: HeldMessage, rates: Rates, { messages, counts }: PresentQueues): number {
  const holds = new Set(tokens);
  const total = messages.reduce((sum, c) => sum + c, 0);
  const logs = Array.from(messages, (c) => Math.log((alpha + c) / (total + alpha * (messages.length + 1))));
  for (const [token, m] of rates) {
    const d = counts.get(token);
    for (let k = 0; k < logs.length; k += 1) {
      const c = messages[k] as number;
      const p = Math.min((concentration * m + (d?.[k] ?? 0)) / (concentration + c), 1 - 1e-9);
      logs[k] += holds.has(token) ? Math.log(p) : Math.log1p(-p);
    }
  }
  const top = Math.max(...logs);
  return top + Math.log(logs.reduce((sum, log) => sum + Math.exp(log - top), 0));
}

/** Those that most messages of the group hold and few others: by the evidence of their presence. */
function tellingTokens(group: Group, rates: Rates): number[] {
  const n = group.members.length;
  return [...group.hits]
    .filter(([, k]) => k >= 2)
    .map(([token, k]) => {
      const m = rates.get(token) as number;
      return { token, score: k * Math.log(k / n / m) };
    })
    .sort((a, b) => b.score - a.score || a.token - b.token)
    .map(({ token }) => token);
}
