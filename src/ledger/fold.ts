import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import type { Fault } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { encodeFeatures } from '../model/codec-entries.ts';
import { checkKey } from '../store/checks.ts';
import { historyKey } from './history-store.ts';
import { type Landing, land, type Work } from './land.ts';
import { faultOf } from './pace.ts';
import { isQueueOpen } from './queue-names.ts';
import type { Claim, FoldOutcome, World } from './world.ts';

export interface FoldOptions {
  /** A claim that another process folds is left to it for this long before it is taken over. */
  readonly patienceMs?: number;
}

/** Folds confirmations into the counts, exactly once each. One outcome a claim, in order. One write for each message whose
 *  history changes, and two for the batch. A failing store is answered with `retry`: the claim must be kept and folded
 *  again, by this or any other process. Does not throw. */
export async function foldClaims(
  world: World,
  desk: Desk,
  schema: Schema,
  claims: readonly Claim[],
  options: FoldOptions = {},
): Promise<FoldOutcome[]> {
  const outcomes = new Array<FoldOutcome>(claims.length);
  const byMessage = new Map<string, number[]>();
  claims.forEach((claim, i) => {
    const fault = faultIn(claim, world.nowMs());
    if (fault) outcomes[i] = { kind: 'refused', fault };
    else {
      const { message } = claim.confirmation;
      byMessage.set(message, [...(byMessage.get(message) ?? []), i]);
    }
  });
  const works = [...byMessage].map(
    ([message, at]): Work => ({
      message,
      requests: at.map((i) => ({
        kind: 'confirm',
        ...claims[i],
        encoded: encodeFeatures(claims[i].features),
      })),
    }),
  );
  const landings = await land(world, schema, works, {
    patienceMs: options.patienceMs ?? bounds.foldPatienceMs,
    refuse: (request, { renames }) =>
      request.kind !== 'confirm' || isQueueOpen(desk, renames, request.confirmation.queue)
        ? null
        : {
            code: 'queue-unknown',
            place: place(request),
            expected: 'a queue of the desk',
            got: request.confirmation.queue,
          },
  });
  [...byMessage.values()].forEach((at, w) => {
    at.forEach((i, r) => {
      outcomes[i] = outcomeOf(landings[w], r);
    });
  });
  return outcomes;
}

function outcomeOf(landing: Landing, request: number): FoldOutcome {
  if (landing.kind === 'unknown') return { kind: 'retry', fault: landing.fault };
  const answer = landing.answers[request];
  return answer.kind === 'done' ? { kind: 'folded' } : answer;
}

function faultIn(claim: Claim, nowMs: number): Fault | null {
  const key = historyKey(claim.confirmation.message);
  try {
    checkKey(key);
  } catch (error) {
    return faultOf(error, key);
  }
  const atMs = Date.parse(claim.confirmation.at);
  if (atMs >= 0 && atMs <= nowMs + bounds.confirmedAheadMsMax) return null;
  return {
    code: 'confirmation-time-refused',
    place: place(claim),
    expected: 'an ISO 8601 time from 1970 to one day ahead',
    got: Number.isNaN(atMs) ? 'no time' : new Date(atMs).toISOString(),
  };
}

function place({ confirmation }: Pick<Claim, 'confirmation'>): string {
  return historyKey(confirmation.message);
}
