import pointer from 'jsonpointer';
import { Webhook } from 'standardwebhooks';
import { bounds } from '../bounds.ts';
import type { ConfirmationMapping } from '../desk/intake-settings.ts';
import { type FieldFault, type Reply, replyProblem } from './reply.ts';
import { type IntakeRequest, mediaTypeOf, nestsDeeperThan, textOf } from './request.ts';

/** A confirmation as a helpdesk's webhook states it, checked. */
export interface StatedConfirmation {
  /** The webhook's id: the idempotency key of the Standard Webhooks specification. */
  readonly webhookId: string;
  readonly message: string;
  readonly queue: string;
  readonly by: string;
  /** ISO 8601 in UTC. */
  readonly at: string;
}

/** True when one of the secrets signed this request and its timestamp is within the specification's tolerance.
 *  Two secrets are held while one is being replaced. Source: Standard Webhooks 1.0.0, "Verifying signatures". */
function isSigned(request: IntakeRequest, text: string, secrets: readonly string[]): boolean {
  return secrets.some((secret) => {
    try {
      new Webhook(secret).verify(text, request.headers as Record<string, string>, { jsonParse: false });
      return true;
    } catch {
      return false;
    }
  });
}

function readText(value: unknown, at: string): string | null {
  let found: unknown;
  try {
    found = pointer.get(value as object, at);
  } catch {
    return null;
  }
  if (typeof found === 'number' && Number.isFinite(found)) return String(found);
  return typeof found === 'string' ? found : null;
}

/** Printable ASCII or any letter beyond, no controls: these values reach logs and keys. */
const plainLine = /^[^\p{Cc}\u2028\u2029]+$/u;

/** Seconds or milliseconds since the epoch, or ISO 8601; null when it is none of them. */
function readTime(text: string): string | null {
  const ms = /^\d{9,10}$/.test(text)
    ? Number(text) * 1000
    : /^\d{12,13}$/.test(text)
      ? Number(text)
      : Date.parse(text);
  const isDated = /^\d{9,13}$/.test(text) || /^\d{4}-\d{2}-\d{2}T/.test(text);
  return isDated && Number.isFinite(ms) ? new Date(ms).toISOString() : null;
}

/** Verifies a signed webhook and maps the helpdesk's JSON to a confirmation.
 *  `queues`: ids that the desk knows. Gives the confirmation or the problem to answer (400, 401, 413, 415, 422). */
export function readWebhook(
  mapping: ConfirmationMapping,
  queues: ReadonlySet<string>,
  secrets: readonly string[],
  request: IntakeRequest,
): StatedConfirmation | Reply {
  if (request.body.length > bounds.intakeWebhookBytesMax) {
    return replyProblem(
      413,
      'body-too-large',
      `A webhook may have ${bounds.intakeWebhookBytesMax} bytes at most.`,
    );
  }
  const text = textOf(request.body);
  if (text === null) return replyProblem(400, 'not-utf-8', 'The body is not valid UTF-8.');
  // The signature comes before any other look at the content: an unsigned request learns nothing of what is expected.
  if (!isSigned(request, text, secrets)) {
    return replyProblem(
      401,
      'signature',
      'Sign webhook-id, webhook-timestamp and body by Standard Webhooks 1.0.0; the time may differ by 5 minutes.',
    );
  }
  const webhookId = request.headers['webhook-id'] ?? '';
  if (webhookId.length > bounds.webhookIdCharsMax || !/^[\x21-\x7e]+$/.test(webhookId)) {
    return replyProblem(
      400,
      'webhook-id',
      `webhook-id must be 1 to ${bounds.webhookIdCharsMax} printable ASCII characters.`,
    );
  }
  if (mediaTypeOf(request) !== 'application/json') {
    return replyProblem(415, 'media-type', 'Send application/json.', {
      headers: { accept: 'application/json' },
    });
  }
  if (nestsDeeperThan(text, bounds.intakeWebhookDepthMax)) {
    return replyProblem(
      400,
      'json-too-deep',
      `JSON may nest ${bounds.intakeWebhookDepthMax} levels at most.`,
    );
  }
  let value: unknown;
  try {
    value = JSON.parse(text);
  } catch {
    return replyProblem(400, 'json-unreadable', 'The body is not valid JSON (RFC 8259).');
  }
  if (typeof value !== 'object' || value === null) {
    return replyProblem(422, 'not-an-object', 'The body must be a JSON object.');
  }
  const errors: FieldFault[] = [];
  const take = (at: string, charactersMax: number): string => {
    const found = readText(value, at)?.trim() ?? '';
    if (found === '' || found.length > charactersMax || !plainLine.test(found)) {
      errors.push({ pointer: at, expected: `one line of 1 to ${charactersMax} characters` });
    }
    return found;
  };
  const message = take(mapping.message, bounds.messageIdCharsMax);
  const stated = take(mapping.queue, bounds.confirmationLineCharsMax);
  const by = take(mapping.by, bounds.confirmationLineCharsMax);
  const at = readTime(take(mapping.at, bounds.confirmationLineCharsMax));
  const queue = Object.hasOwn(mapping.queueNames, stated) ? mapping.queueNames[stated]! : stated;
  if (errors.length === 0 && at === null)
    errors.push({ pointer: mapping.at, expected: 'ISO 8601 date and time, or seconds since the epoch' });
  if (errors.length === 0 && !queues.has(queue))
    errors.push({ pointer: mapping.queue, expected: 'a queue of the desk, or a name in queueNames' });
  if (errors.length > 0 || at === null) {
    return replyProblem(422, 'confirmation', 'The mapped members do not make a confirmation.', { errors });
  }
  return { webhookId, message, queue, by, at };
}
