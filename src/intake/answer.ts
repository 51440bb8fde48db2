import { createHash } from 'node:crypto';
import type { IntakeForm, IntakeSettings } from '../desk/intake-settings.ts';
import { keys, traceMetadata } from '../store/keys.ts';
import type { Store } from '../store/store.ts';
import { readSubmission } from './read-submission.ts';
import { readWebhook } from './read-webhook.ts';
import { type Reply, replyJson, replyProblem } from './reply.ts';
import type { IntakeRequest } from './request.ts';

export interface IntakeWorld {
  readonly store: Store;
  readonly nowMs: () => number;
  /** Uniform in [0, 1). */
  readonly random: () => number;
}

export interface IntakeDesk {
  readonly settings: IntakeSettings;
  /** Ids of the desk's queues. */
  readonly queues: ReadonlySet<string>;
  /** Secrets of the helpdesk's webhooks, newest first; none: confirmations are not taken. */
  readonly webhookSecrets: readonly string[];
}

const utf8 = new TextEncoder();

/** 64 bits in base 36: with the time before it, ids of one millisecond do not meet. */
function drawId(random: () => number): string {
  const part = () =>
    Math.floor(random() * 2 ** 32)
      .toString(36)
      .padStart(7, '0');
  return part() + part();
}

/** CORS (Fetch standard): the header that lets a listed origin read the answer; `null` when the origin is not listed. */
function corsHeaders(
  settings: IntakeSettings,
  request: IntakeRequest,
): Readonly<Record<string, string>> | null {
  const origin = request.headers.origin;
  if (origin === undefined) return {};
  return settings.origins.includes(origin) ? { 'access-control-allow-origin': origin, vary: 'origin' } : null;
}

async function takeForm(world: IntakeWorld, form: IntakeForm, request: IntakeRequest): Promise<Reply> {
  const nowMs = world.nowMs();
  const submission = readSubmission(form, request, nowMs);
  if ('status' in submission) return submission;
  if (submission.suspicion !== null && form.onSuspect === 'refuse') {
    return replyProblem(422, 'looks-automatic', 'The submission looks as if a program had sent it.');
  }
  const at = new Date(nowMs).toISOString();
  const message = `forms/${form.id}/${at.slice(0, 10)}/${at.replace(/[:.]/g, '-')}-${drawId(world.random)}.json`;
  const document = {
    form: form.id,
    at,
    ...(submission.sender === null ? {} : { from: submission.sender }),
    ...(submission.suspicion === null ? {} : { suspicion: submission.suspicion }),
    fields: Object.fromEntries(submission.fields),
  };
  const stored = keys.inbound + message;
  // No condition: the name is drawn, so nothing can stand there but this very write, sent again after its answer was lost;
  // with a condition that would come back as a lost race, and telling the two apart would take the right to read forms.
  await world.store.put(stored, utf8.encode(JSON.stringify(document)), {
    contentType: 'application/json',
    ...(request.trace === '' ? {} : { metadata: { [traceMetadata]: request.trace } }),
  });
  if (form.thanksUrl === null) return { ...replyJson(202, { message }), stored };
  const headers = { location: form.thanksUrl, 'cache-control': 'no-store' };
  return { ...replyJson(303, { message }), headers, stored };
}

/** The drop is written first and the mark after it: a crash between them leaves a drop that a repeated webhook finds
 *  (or that was folded, and folding it again changes nothing). The other order could lose a confirmation. */
async function takeConfirmation(
  world: IntakeWorld,
  desk: IntakeDesk,
  request: IntakeRequest,
): Promise<Reply> {
  if (desk.webhookSecrets.length === 0) {
    return replyProblem(503, 'no-secret', 'No webhook secret is set for this desk.');
  }
  const stated = readWebhook(desk.settings.confirmations, desk.queues, desk.webhookSecrets, request);
  if ('status' in stated) return stated;
  const { webhookId, ...confirmation } = stated;
  const name = createHash('sha256').update(webhookId).digest('hex');
  const mark = `${keys.webhookMarks}${name}`;
  const stored = `${keys.confirmations}webhook-${name}.json`;
  if ((await world.store.head(mark)) !== null)
    return { ...replyJson(200, { message: confirmation.message, taken: 'before' }), stored };
  // A lost race is this drop, written by another delivery of the same webhook or by a repeated request of this one.
  await world.store.put(stored, utf8.encode(JSON.stringify(confirmation)), {
    ifNoneMatch: '*',
    contentType: 'application/json',
  });
  await world.store.put(mark, new Uint8Array(0), { ifNoneMatch: '*' });
  return { ...replyJson(202, { message: confirmation.message, taken: 'now' }), stored };
}

/** Answers one request. Throws only what the store throws.
 *  `POST /forms/{form}` stores a submission; `POST /confirmations` drops a signed confirmation. */
export async function answerRequest(
  world: IntakeWorld,
  desk: IntakeDesk,
  request: IntakeRequest,
): Promise<Reply> {
  const cors = corsHeaders(desk.settings, request);
  const [first, second, ...rest] = request.path;
  const isForm = first === 'forms' && second !== undefined && rest.length === 0;
  const isConfirmation = first === 'confirmations' && second === undefined;
  if (!isForm && !isConfirmation)
    return replyProblem(404, 'no-such-place', 'Post to /forms/{form} or /confirmations.');
  if (isForm && cors === null)
    return replyProblem(403, 'origin', "Add the page's origin to the desk's file to let it post here.");
  if (request.method === 'OPTIONS' && isForm) {
    return {
      status: 204,
      headers: {
        ...cors,
        'access-control-allow-methods': 'POST',
        'access-control-allow-headers': 'content-type',
        'access-control-max-age': '600',
      },
      body: '',
    };
  }
  if (request.method !== 'POST') {
    return replyProblem(405, 'method', 'Only POST is served here.', {
      headers: { allow: isForm ? 'POST, OPTIONS' : 'POST' },
    });
  }
  if (isConfirmation) return takeConfirmation(world, desk, request);
  const form = desk.settings.forms.find((one) => one.id === second);
  const reply =
    form === undefined
      ? replyProblem(404, 'no-such-form', 'The desk declares no form of this name.')
      : await takeForm(world, form, request);
  return { ...reply, headers: { ...reply.headers, ...cors } };
}
