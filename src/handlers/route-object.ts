import { bounds } from '../bounds.ts';
import { decide } from '../decision/decide.ts';
import type { Decision } from '../decision/decision.ts';
import { createSipHash, type SipHash } from '../features/siphash.ts';
import type { Message } from '../message/message.ts';
import type { Posterior } from '../model/posterior.ts';
import { posteriorOf } from '../model/posterior-of.ts';
import { markWaiting } from '../settle/waiting-marks.ts';
import { keys } from '../store/keys.ts';
import type { EventObject } from './event-objects.ts';
import type { HandlerDeps, LogLine } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { readMessage } from './read-message.ts';
import { isDecided, joinMetadata, metadataOf, traceIn } from './routing-metadata.ts';
import type { Workbench } from './workbench.ts';

/** The receiving service leaves this when a rule is set up. */
const setupNotice = 'AMAZON_SES_SETUP_NOTIFICATION';

/** Routes one object and writes the decision on it. True when nothing remains to be done; false when it must be tried again.
 *  A message that carries a decision is left alone, so that repeated delivery changes nothing and writing cannot loop. */
export async function routeObject(
  deps: HandlerDeps,
  bench: Workbench,
  { key, trace }: EventObject,
): Promise<boolean> {
  // A form carries the id of the request that brought it; its line says so.
  const log = (line: LogLine) => deps.log({ trace, ...line, message: key.slice(keys.inbound.length) });
  if (!isRoutable(key)) {
    log({ level: 'info', event: 'object-skipped' });
    return true;
  }
  try {
    for (let attempt = 0; attempt < bounds.routeAttemptsMax; attempt++) {
      const line = await routeOnce(deps, bench, key, trace);
      if (line === null) continue;
      log(line);
      return true;
    }
    log({ level: 'warn', event: 'object-changing', attempts: bounds.routeAttemptsMax });
  } catch (error) {
    log({ level: 'error', event: 'route-failed', ...faultMembers(error) });
  }
  return false;
}

/** Archived mail is there to be learned from: it was dealt with years ago. */
export function isRoutable(key: string): boolean {
  return key.startsWith(keys.inbound) && !key.startsWith(keys.archive) && !key.endsWith(`/${setupNotice}`);
}

/** What was done, to be logged; null when the object changed meanwhile. */
async function routeOnce(
  deps: HandlerDeps,
  bench: Workbench,
  key: string,
  trace: string,
): Promise<LogLine | null> {
  const { world } = deps;
  const found = await readMessage(world, key, (head) => !isDecided(head.metadata));
  if (found === null) return { level: 'warn', event: 'message-missing' };
  const { head, message, parserError } = found;
  if (message === null) return { level: 'info', event: 'decided-already' };
  const { decision, posterior } = decideMessage(deps, bench, key, message);
  const context = {
    modelVersion: bench.model.version,
    schema: bench.extractor.schema.id,
    atMs: world.nowMs(),
    trace: traceIn(head.metadata) || trace,
  };
  const metadata = joinMetadata(head.metadata, metadataOf(decision, posterior, context), key);
  const isForPerson = decision.kind === 'held' || metadata['tallypost-audit'] === 'yes';
  if (deps.isMarkingWaiting === true && isForPerson) await markWaiting(world, key.slice(keys.inbound.length));
  const put = await world.store.replaceMetadata(key, metadata, { ifMatch: head.etag });
  if (put.kind === 'lost') return null;
  if (put.kind === 'missing') return { level: 'warn', event: 'message-missing' };
  const { kind, ...members } = decision;
  return {
    level: parserError === null ? 'info' : 'error',
    event: kind,
    ...members,
    trace: context.trace,
    model: bench.model.version,
    bytes: head.bytes,
    defects: message.defects.map(({ code }) => code),
    ...(parserError === null ? {} : faultMembers(parserError)),
  };
}

/** The decision on a message. Whether it is marked for a look is drawn from its key, so that a repeated delivery draws the
 *  same, and keyed, so that no sender can choose it. */
export function decideMessage(
  { tokenKey }: Pick<HandlerDeps, 'tokenKey'>,
  { desk, extractor, model }: Workbench,
  key: string,
  message: Message,
): { readonly decision: Decision; readonly posterior: Posterior } {
  const posterior = posteriorOf(model.scorer, extractor.extract(message));
  const draw = hashUnder(tokenKey).fraction(`look ${key}`);
  const decision = decide({ posterior, message, desk, modelKnows: !model.isEmpty, draw });
  const isForWantOfModel =
    decision.kind === 'held' && decision.reason === 'nothing-learned' && model.fault !== null;
  return { posterior, decision: isForWantOfModel ? { ...decision, reason: 'model-unusable' } : decision };
}

const hashes = new WeakMap<Uint8Array, SipHash>();

function hashUnder(tokenKey: Uint8Array): SipHash {
  const known = hashes.get(tokenKey) ?? createSipHash(tokenKey);
  hashes.set(tokenKey, known);
  return known;
}
