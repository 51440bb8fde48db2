import { bounds } from '../bounds.ts';
import type { CountsView } from './counts.ts';
import { rowsOf } from './rows.ts';
import { logBetaBinomial } from './special.ts';

/** Evidence that a queue's wording changed lately, by region. */
export interface Drift {
  readonly queue: string;
  readonly region: string;
  readonly earlierMessages: number;
  readonly recentMessages: number;
  /** log Bayes factor, nats: some tokens changed their rate, against every token kept its. Above 5 is very strong evidence. */
  readonly logFactor: number;
  /** Tokens that speak most for a change, strongest first; hashes. */
  readonly tokens: readonly {
    readonly token: number;
    readonly logFactor: number;
    readonly hasRisen: boolean;
  }[];
}

/** Share of a region's tokens expected to change before anything is seen. */
const changedShare = 0.01;
/** Weight of a token's pooled rate in the prior of its rates, in messages. */
const priorMessages = 1;

/** Compares, for each queue, the messages of the newest `recentEpochs` epochs with those before. A token's rate in the queue is
 *  drawn from Beta(s·m, s·(1-m)) around its rate m over all queues, once for both times or once for each; tokens change with
 *  probability 0.01, each by itself, so that thousands of unchanged ones cost next to nothing:
 *
 *      log factor = Σ_t log(0.99 + 0.01 · B(earlier)·B(recent)/B(both))
 *
 *  summed over the tokens that at least `driftSeenMin` of the queue's messages hold: names, numbers and rare words are always new,
 *  in every week, and thousands of them, a little each, would outweigh everything.
 *  Queues with fewer than `driftMessagesMin` messages on either side are left out. Largest first. O(cells).
 *  Bayes factors and their scale: Kass and Raftery, JASA 90 (1995), section 3. */
export function findDrift(counts: CountsView, recentEpochs: number): Drift[] {
  const newest = counts.columns.reduce((max, c) => Math.max(max, c.epoch), 0);
  const queues = [...new Set(counts.columns.map((c) => c.queue))];
  const queueOf = Uint32Array.from(counts.columns, (c) => queues.indexOf(c.queue));
  const isRecent = counts.columns.map((c) => c.epoch > newest - recentEpochs);
  const messages = queues.map(() => [0, 0]);
  counts.messages.forEach((c, i) => {
    messages[queueOf[i]][isRecent[i] ? 1 : 0] += c;
  });
  const all = counts.messages.reduce((sum, c) => sum + c, 0);
  const compared = queues.map((_, k) => Math.min(...messages[k]) >= bounds.driftMessagesMin);

  return counts.regions
    .flatMap((region, g) => {
      const logFactor = new Float64Array(queues.length);
      const tokens = queues.map((): Drift['tokens'][number][] => []);
      const weakest = new Float64Array(queues.length);
      const earlier = new Float64Array(queues.length);
      const recent = new Float64Array(queues.length);
      const touched = new Uint32Array(queues.length);
      const factorOf = createFactors(messages, all);
      const rows = rowsOf(region);
      const { column, count } = rows;
      while (rows.next()) {
        let seen = 0;
        let length = 0;
        for (let p = rows.from; p < rows.to; p++) {
          const k = queueOf[column[p]];
          seen += count[p];
          if (!compared[k]) continue;
          if (earlier[k] + recent[k] === 0) touched[length++] = k;
          if (isRecent[column[p]]) recent[k] += count[p];
          else earlier[k] += count[p];
        }
        for (let i = 0; i < length; i++) {
          const k = touched[i];
          const isTelling = earlier[k] + recent[k] >= bounds.driftSeenMin;
          const { factor, share } = isTelling
            ? factorOf(k, earlier[k], recent[k], seen)
            : { factor: 0, share: 0 };
          logFactor[k] += share;
          if (factor > weakest[k]) {
            const hasRisen = recent[k] * messages[k][0] > earlier[k] * messages[k][1];
            tokens[k].push({ token: rows.token, logFactor: factor, hasRisen });
            if (tokens[k].length >= 1000) weakest[k] = keepStrongest(tokens[k]);
          }
          earlier[k] = 0;
          recent[k] = 0;
        }
      }
      return queues.flatMap((queue, k): Drift[] => {
        if (!compared[k]) return [];
        keepStrongest(tokens[k]);
        return [
          {
            queue,
            region: counts.schema.regions[g].id,
            earlierMessages: messages[k][0],
            recentMessages: messages[k][1],
            logFactor: logFactor[k],
            tokens: tokens[k],
          },
        ];
      });
    })
    .sort((a, b) => b.logFactor - a.logFactor);
}

/** Answers the factor that a later token must exceed: of equal ones the smaller token is kept. */
function keepStrongest(tokens: Drift['tokens'][number][]): number {
  tokens.sort((a, b) => b.logFactor - a.logFactor || a.token - b.token);
  tokens.length = Math.min(tokens.length, bounds.driftTokensMax);
  return tokens.at(-1)?.logFactor ?? 0;
}

interface Factor {
  readonly factor: number;
  /** What the token adds to the queue's. */
  readonly share: number;
}

/** The factor of a token by its counts. Those of rare tokens, nearly all, are remembered. */
function createFactors(messages: readonly (readonly number[])[], all: number) {
  const known = new Map<number, Factor>();
  return (k: number, earlier: number, recent: number, seen: number): Factor => {
    const isRare = seen < 64 && Number.isInteger(seen);
    const key = ((k * 64 + earlier) * 64 + recent) * 64 + seen;
    const held = isRare ? known.get(key) : undefined;
    if (held) return held;
    const factor = changeFactor([earlier, recent], messages[k], (seen + 0.5) / (all + 1));
    const made = { factor, share: Math.log1p(changedShare * Math.expm1(Math.min(factor, 500))) };
    if (isRare) known.set(key, made);
    return made;
  };
}

/** log Bayes factor of two rates, before and since, against one. */
function changeFactor([k1, k2]: readonly number[], [n1, n2]: readonly number[], m: number): number {
  const a = priorMessages * m;
  const b = priorMessages * (1 - m);
  return (
    logBetaBinomial(k1, n1, a, b) + logBetaBinomial(k2, n2, a, b) - logBetaBinomial(k1 + k2, n1 + n2, a, b)
  );
}
