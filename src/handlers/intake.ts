import { answerRequest, type IntakeDesk, type IntakeWorld } from '../intake/answer.ts';
import { replyProblem } from '../intake/reply.ts';
import type { IntakeRequest } from '../intake/request.ts';
import type { LogLine } from './handler-deps.ts';

/** A function URL's event, payload format 2.0: the members that are read.
 *  Source: AWS Lambda Developer Guide, "Invoking Lambda function URLs", request payload format. */
export interface UrlEvent {
  readonly rawPath?: string;
  readonly headers?: Readonly<Record<string, string | undefined>>;
  readonly body?: string;
  readonly isBase64Encoded?: boolean;
  readonly requestContext: { readonly requestId?: string; readonly http: { readonly method: string } };
}

export interface UrlResult {
  readonly statusCode: number;
  readonly headers: Readonly<Record<string, string>>;
  readonly body: string;
}

export interface IntakeDeps {
  readonly world: IntakeWorld;
  readonly loadDesk: () => Promise<IntakeDesk>;
  /** One line of structured log; never a customer's text. */
  readonly log: (line: LogLine) => void;
}

function requestOf(event: UrlEvent): IntakeRequest | null {
  const headers: Record<string, string> = {};
  for (const [name, value] of Object.entries(event.headers ?? {})) {
    if (value !== undefined) headers[name.toLowerCase()] = value;
  }
  try {
    const path = (event.rawPath ?? '/').split('/').filter(Boolean).map(decodeURIComponent);
    const body = Buffer.from(event.body ?? '', event.isBase64Encoded === true ? 'base64' : 'utf8');
    return {
      method: event.requestContext.http.method.toUpperCase(),
      path,
      headers,
      body,
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
