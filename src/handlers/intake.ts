import { answerRequest, type IntakeDesk, type IntakeWorld } from '../intake/answer.ts';
import { replyProblem } from '../intake/reply.ts';
import type { IntakeRequest } from '../intake/request.ts';
import type { LogLine } from './handler-deps.ts';
import { bodyOf, headersOf, methodOf, type UrlEvent, type UrlResult } from './url-event.ts';

export interface IntakeDeps {
  readonly world: IntakeWorld;
  readonly loadDesk: () => Promise<IntakeDesk>;
  /** One line of structured log; never a customer's text. */
  readonly log: (line: LogLine) => void;
}

function requestOf(event: UrlEvent): IntakeRequest | null {
  try {
    const path = (event.rawPath ?? '/').split('/').filter(Boolean).map(decodeURIComponent);
    return {
      method: methodOf(event),
      path,
      headers: headersOf(event),
      body: bodyOf(event),
      trace: traceOf(event),
    };
  } catch {
    return null;
  }
}

/** Becomes metadata of what is stored, so that only what may stand there passes. */
function traceOf({ requestContext: { requestId = '' } }: UrlEvent): string {
  return /^[\x21-\x7e]{1,64}$/.test(requestId) ? requestId : '';
}

/** The HTTPS intake: forms and signed confirmations in, problem details (RFC 9457) out. Never throws. */
export function createIntakeHandler(deps: IntakeDeps): (event: UrlEvent) => Promise<UrlResult> {
  return async (event) => {
    const trace = traceOf(event);
    const request = requestOf(event);
    let reply = replyProblem(400, 'path', 'The path is not valid percent-encoding (RFC 3986).');
    let fault: string | null = null;
    try {
      if (request !== null) reply = await answerRequest(deps.world, await deps.loadDesk(), request);
    } catch (error) {
      fault = error instanceof Error ? ((error as { code?: string }).code ?? error.name) : 'unknown';
      reply = replyProblem(503, 'unavailable', 'Nothing was stored.', { headers: { 'retry-after': '5' } });
    }
    deps.log({
      event: 'intake',
      level: fault === null ? 'info' : 'error',
      status: reply.status,
      trace,
      ...(reply.stored === undefined ? {} : { stored: reply.stored }),
      ...(fault === null ? {} : { fault }),
    });
    return { statusCode: reply.status, headers: reply.headers, body: reply.body };
  };
}
