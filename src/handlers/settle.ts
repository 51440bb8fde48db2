import { bounds } from '../bounds.ts';
import { dropLeft } from '../settle/pending.ts';
import {
  createSettleApp,
  failurePage,
  type SettleApp,
  type SettleReply,
  type SettleRequest,
  sweepUsed,
} from '../settle/settle-app.ts';
import { ticketKeyOf } from '../settle/ticket.ts';
import { createMarkedWaitingList } from '../settle/waiting-marks.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { readMessage } from './read-message.ts';
import { createBenchOpener } from './settle-bench.ts';
import { bodyOf, headersOf, methodOf, type UrlEvent, type UrlResult } from './url-event.ts';

/** A request to the page by its function URL, payload format 2.0: the members that are read beside the intake's.
 *  Source: AWS Lambda Developer Guide, "Invoking Lambda function URLs". */
export interface SettleUrlEvent extends UrlEvent {
  readonly rawQueryString?: string;
  /** Cookies stand here, one each, and not among the headers. */
  readonly cookies?: readonly string[];
  readonly requestContext: UrlEvent['requestContext'] & { readonly domainName?: string };
}

export interface SettleUrlResult extends UrlResult {
  /** Likewise: a `set-cookie` among the headers is not passed on. */
  readonly cookies: readonly string[];
}

/** What the schedule starts: settlements that nobody followed by another are dropped for good. */
export interface Finished {
  readonly dropped: number;
}

/** The page for held messages behind a function URL: the same as on a person's own machine. `secret`: what links are signed
 *  with. Any event that is no request ends what was left lying. Never throws on a request. */
export function createSettleHandler(
  deps: HandlerDeps,
  secret: Uint8Array,
): (event: unknown) => Promise<SettleUrlResult | Finished> {
  const openBench = createBenchOpener(deps);
  const waiting = createMarkedWaitingList(deps.world);
  // The confirm function hears of a drop from the bucket.
  const onDropped = async () => {};
  // A function has one address.
  let last: { readonly origin: string; readonly app: SettleApp } | null = null;
  const appAt = (origin: string): SettleApp => {
    if (last?.origin === origin) return last.app;
    const app = createSettleApp({
      world: deps.world,
      openBench,
      readMessage: async (key) => (await readMessage(deps.world, key, () => true))?.message ?? null,
      waiting,
      ticketKey: ticketKeyOf(secret, origin),
      origin,
      base: '',
      onDropped,
    });
    last = { origin, app };
    return app;
  };

  return async (event) => {
    if (!isRequest(event)) return finish(deps);
    const trace = event.requestContext.requestId ?? '';
    let reply: SettleReply;
    let fault = {};
    try {
      const request = requestOf(event);
      reply =
        request.body.length > bounds.settleBodyBytesMax
          ? { status: 413, headers: {}, body: '' }
          : await appAt(`https://${event.requestContext.domainName}`)(request);
    } catch (error) {
      fault = faultMembers(error);
      reply = failurePage('', error);
    }
    const level = reply.status >= 500 ? 'error' : 'info';
    // Neither path nor person: the one names a message, the other a colleague.
    deps.log({ level, event: 'settle', status: reply.status, trace, ...fault });
    return resultOf(reply);
  };
}

async function finish({ world, log }: HandlerDeps): Promise<Finished> {
  let dropped = 0;
  const onDropped = async () => {
    dropped += 1;
  };
  try {
    await dropLeft(world.store, world.nowMs(), bounds.settleUndoMs, onDropped);
    await sweepUsed(world, world.nowMs());
  } catch (error) {
    log({ level: 'error', event: 'settle-finish-failed', ...faultMembers(error) });
    throw error;
  }
  log({ level: 'info', event: 'settle-finished', dropped });
  return { dropped };
}

function isRequest(event: unknown): event is SettleUrlEvent {
  const context = (event as { requestContext?: { http?: unknown } } | null)?.requestContext;
  return typeof context?.http === 'object' && context.http !== null;
}

function requestOf(event: SettleUrlEvent): SettleRequest {
  const headers = headersOf(event);
  if (event.cookies !== undefined) headers.cookie = event.cookies.join('; ');
  return {
    method: methodOf(event),
    path: event.rawPath ?? '/',
    query: new URLSearchParams(event.rawQueryString ?? ''),
    headers,
    body: bodyOf(event),
  };
}

function resultOf({ status, headers, body }: SettleReply): SettleUrlResult {
  const { 'set-cookie': cookie, ...others } = headers;
  return {
    statusCode: status,
    headers: { ...others, 'strict-transport-security': 'max-age=31536000' },
    cookies: cookie === undefined ? [] : [cookie],
    body,
  };
}
