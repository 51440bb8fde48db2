import type { Said } from './counts.ts';

/** Bands of the log odds of the stated posterior: 0.75 nats wide from -3 (a posterior of 0.047) to 9 (0.99988); the first
 *  and the last are open. Narrow enough to show a bias, wide enough to fill within a few hundred confirmations. */
export const recordBands = 16;
const firstEdge = -3;
const bandWidth = 0.75;

/** The band of a stated posterior. 0 and 1 fall in the outermost bands. */
export function bandOf(posterior: number): number {
  return bandOfLogOdds(Math.log(posterior) - Math.log1p(-posterior));
}

export function bandOfLogOdds(logOdds: number): number {
  return Math.min(recordBands - 1, Math.max(0, Math.floor((logOdds - firstEdge) / bandWidth)));
}

export function bandMiddleLogOdds(band: number): number {
  return firstEdge + (band + 0.5) * bandWidth;
}

/** Probabilities at which bands meet: band b reaches from edges[b] to edges[b + 1]; [bands + 1]. */
export function bandEdges(): number[] {
  return Array.from({ length: recordBands + 1 }, (_, b) =>
    b === 0 ? 0 : b === recordBands ? 1 : 1 / (1 + Math.exp(-(firstEdge + b * bandWidth))),
  );
}

/** Adds one statement to the record in place: `record[4 * band + 2 * isAudit + (0 for hit, 1 for miss)] += sign`. */
export function recordSaid(record: Float64Array, said: Said, confirmed: string, sign: number): void {
  record[4 * bandOf(said.posterior) + (said.isAudit ? 2 : 0) + (said.queue === confirmed ? 0 : 1)] += sign;
}
