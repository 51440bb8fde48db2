import { logBetaBinomial } from '../model/special.ts';

/** Messages of one queue by whether they hold each token, before and since a day. */
export interface TwoTimes {
  readonly earlierMessages: number;
  readonly recentMessages: number;
  /** Token to messages that hold it. */
  readonly earlier: ReadonlyMap<number, number>;
  readonly recent: ReadonlyMap<number, number>;
}

export interface DriftEvidence {
  /** Nats: that some tokens changed their rate, against one rate throughout for all. */
  readonly nats: number;
  /** Tokens that come more often now, most telling first. */
  readonly risen: readonly number[];
}

/** Share of tokens expected to change before anything is seen: few do. */
const changedShare = 0.01;
/** A token seen in fewer messages cannot tell. */
const messagesMin = 4;

/** Closed-form evidence that a queue's words changed. For each token the evidence of two rates (before, since) stands against
 *  that of one, all under Beta(½, ½); a token counts as changed with probability 0.01 before the data, so that thousands of
 *  unchanged tokens cost next to nothing: Σ_t log(0.99 + 0.01 · B_two / B_one). Bayes factors: Kass and Raftery, JASA 90
 *  (1995), section 3. */
export function weighDrift({ earlierMessages, recentMessages, earlier, recent }: TwoTimes): DriftEvidence {
  let nats = 0;
  const risen: { token: number; logFactor: number }[] = [];
  for (const token of new Set([...earlier.keys(), ...recent.keys()])) {
    const k = Math.min(earlier.get(token) ?? 0, earlierMessages);
    const r = Math.min(recent.get(token) ?? 0, recentMessages);
    if (k + r < messagesMin) continue;
    const logFactor =
      logBetaBinomial(k, earlierMessages, 0.5, 0.5) +
      logBetaBinomial(r, recentMessages, 0.5, 0.5) -
      logBetaBinomial(k + r, earlierMessages + recentMessages, 0.5, 0.5);
    nats += Math.log(1 - changedShare + changedShare * Math.exp(Math.min(logFactor, 600)));
    if (logFactor > 0 && r * earlierMessages > k * recentMessages) risen.push({ token, logFactor });
  }
  risen.sort((a, b) => b.logFactor - a.logFactor || a.token - b.token);
  return { nats, risen: risen.map(({ token }) => token) };
}
