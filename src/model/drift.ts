import { bounds } from '../bounds.ts';
import type { Counts } from './counts.ts';
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
 *  Queues with fewer than `driftMessagesMin` messages on either side are left out. Largest first. O(cells).
 *  Bayes factors and their scale: Kass and Raftery, JASA 90 (1995), section 3. */
export function findDrift(counts: Counts, recentEpochs: number): Drift[] {
  const newest = counts.columns.reduce((max, c) => Math.max(max, c.epoch), 0);
  const queues = [...new Set(counts.columns.map((c) => c.queue))];
  const queueOf = counts.columns.map((c) => queues.indexOf(c.queue));
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
      const held = queues.map(() => [0, 0]);
      for (let i = 0; i < region.tokens.length; i++) {
        let seen = 0;
        for (const pair of held) pair.fill(0);
        for (let p = region.start[i]; p < region.start[i + 1]; p++) {
          held[queueOf[region.column[p]]][isRecent[region.column[p]] ? 1 : 0] += region.count[p];
          seen += region.count[p];
        }
        const m = (seen + 0.5) / (all + 1);
        for (let k = 0; k < queues.length; k++) {
          if (!compared[k] || held[k][0] + held[k][1] === 0) continue;
          const factor = changeFactor(held[k], messages[k], m);
          logFactor[k] += Math.log1p(changedShare * Math.expm1(Math.min(factor, 500)));
          if (factor <= 0) continue;
          const hasRisen = held[k][1] * messages[k][0] > held[k][0] * messages[k][1];
          tokens[k].push({ token: region.tokens[i], logFactor: factor, hasRisen });
        }
      }
      return queues.flatMap((queue, k): Drift[] => {
        if (!compared[k]) return [];
        const strongest = tokens[k].sort((a, b) => b.logFactor - a.logFactor || a.token - b.token);
        return [
          {
            queue,
            region: counts.schema.regions[g].id,
            earlierMessages: messages[k][0],
            recentMessages: messages[k][1],
            logFactor: logFactor[k],
            tokens: strongest.slice(0, bounds.driftTokensMax),
          },
        ];
      });
    })
    .sort((a, b) => b.logFactor - a.logFactor);
}

/** log Bayes factor of two rates, before and since, against one. */
function changeFactor([k1, k2]: readonly number[], [n1, n2]: readonly number[], m: number): number {
  const a = priorMessages * m;
  const b = priorMessages * (1 - m);
  return (
    logBetaBinomial(k1, n1, a, b) + logBetaBinomial(k2, n2, a, b) - logBetaBinomial(k1 + k2, n1 + n2, a, b)
  );
}
