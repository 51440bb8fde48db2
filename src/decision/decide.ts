import type { Desk } from '../desk/desk.ts';
import type { Message } from '../message/message.ts';
import type { Posterior } from '../model/posterior.ts';
import type { Decision, HoldReason } from './decision.ts';
import { findGuard } from './find-guard.ts';

export interface DecideInput {
  readonly posterior: Posterior;
  readonly message: Message;
  readonly desk: Desk;
  /** Whether anything was ever confirmed; without it a posterior is the prior and no more. */
  readonly modelKnows: boolean;
  /** Uniform in [0, 1): whether a routed message is marked for a person's look. */
  readonly draw: number;
}

/** Share of a message's tokens that the table must hold before the posterior is believed. Measured on short forms and on
 *  long posts, held-out messages of the same desk: below this lie 0.1 % after 50 confirmations, none of 1,000 after 300;
 *  sentences in eight other languages lie at 0 to 0.24 of a desk that writes of one thing in one language. */
export const knownShareMin = 0.25;
/** A message of fewer tokens than this says too little for a share of them to mean anything. */
const tokensMin = 8;
/** Defects after which there is nothing to route by. */
const nothingRead: ReadonlySet<string> = new Set([
  'message-empty',
  'form-unreadable',
  'source-failed',
  'parser-failed',
]);
const loopDefects: ReadonlySet<string> = new Set(['loop-suspected']);
const suspectDefects: ReadonlySet<string> = new Set(['form-suspect']);
/** Defects that explain why there is no text. */
const textUnreadable: ReadonlySet<string> = new Set(['text-unreadable', 'encrypted', 'opaque-signed']);

/** What becomes of a message: the desk's fixed guards first, then whatever a person must look at whatever the words
 *  say, then the queue of least expected cost, unless a person's look costs less than every queue.
 *  Source: the reject option of Chow, "On optimum recognition error and reject tradeoff", IEEE Trans. Information Theory
 *  16 (1970), with the costs by class of Elkan, "The foundations of cost-sensitive learning", IJCAI 2001. */
export function decide(input: DecideInput): Decision {
  const { posterior, message, desk, draw } = input;
  const guard = findGuard(message, desk);
  if (guard !== null) {
    return {
      kind: 'guarded',
      queue: guard.queue,
      posterior: probabilityOf(posterior, guard.queue),
      guard: guard.id,
    };
  }
  const likeliest = indexOfGreatest(posterior.probability);
  const reason = holdReason(input);
  if (reason !== null) {
    const saysNothing = reason === 'nothing-learned' || likeliest === -1;
    return {
      kind: 'held',
      queue: saysNothing ? null : posterior.queues[likeliest]!,
      posterior: saysNothing ? 0 : posterior.probability[likeliest]!,
      reason,
    };
  }
  const minutes = expectedMinutes(posterior, desk);
  const best = cheapest(minutes, posterior.probability);
  if (best === -1 || minutes[best]! > desk.costs.lookMinutes) {
    const queue = posterior.queues[likeliest] ?? null;
    return { kind: 'held', queue, posterior: posterior.probability[likeliest] ?? 0, reason: 'unsure' };
  }
  return {
    kind: 'routed',
    queue: posterior.queues[best]!,
    posterior: posterior.probability[best]!,
    expectedMinutes: minutes[best]!,
    isAudit: draw < desk.auditShare,
  };
}

/** Staff minutes expected to be lost by routing to each queue: E(k) = Σ_{j≠k} p_j · wrong(k) = (1 − p_k) · wrong(k).
 *  Shape: [queues], in the posterior's order. */
export function expectedMinutes(posterior: Posterior, desk: Desk): Float64Array {
  const wrong = new Map(desk.queues.map((queue) => [queue.id, queue.wrongRouteMinutes]));
  return posterior.probability.map(
    (p, k) => (1 - p) * (wrong.get(posterior.queues[k]!) ?? desk.costs.wrongRouteMinutes),
  );
}

function holdReason({ posterior, message, desk, modelKnows }: DecideInput): HoldReason | null {
  const { virus, spam, isAutomatic } = message.facts;
  // Spam chooses its words to mislead: what the receiving service found weighs more than any count of words.
  if (virus === 'fail' || spam === 'fail' || hasDefect(message, suspectDefects)) return 'suspect';
  if (isUnreadable(message)) return 'unreadable';
  // Routing sends no mail, but what stands behind a queue may: an automatic mail in the desk's own name is one that
  // came back, and would again.
  const isFromDesk = message.from !== null && desk.ownAddresses.includes(message.from.address);
  if ((isAutomatic && isFromDesk) || hasDefect(message, loopDefects)) return 'automatic';
  if (!modelKnows) return 'nothing-learned';
  const { tokens, knownTokens } = posterior;
  return tokens >= tokensMin && knownTokens < knownShareMin * tokens ? 'unlike-anything-seen' : null;
}

function isUnreadable(message: Message): boolean {
  return (
    hasDefect(message, nothingRead) || (message.text.trim() === '' && hasDefect(message, textUnreadable))
  );
}

function hasDefect(message: Message, codes: ReadonlySet<string>): boolean {
  return message.defects.some((defect) => codes.has(defect.code));
}

function probabilityOf(posterior: Posterior, queue: string): number {
  return posterior.probability[posterior.queues.indexOf(queue)] ?? 0;
}

/** Least cost; of equal ones the likelier; of equal ones again the first in the desk's order. */
function cheapest(minutes: Float64Array, probability: Float64Array): number {
  let best = -1;
  minutes.forEach((cost, k) => {
    if (
      best === -1 ||
      cost < minutes[best]! ||
      (cost === minutes[best]! && probability[k]! > probability[best]!)
    )
      best = k;
  });
  return best;
}

function indexOfGreatest(values: Float64Array): number {
  let best = -1;
  values.forEach((value, k) => {
    if (best === -1 || value > values[best]!) best = k;
  });
  return best;
}
