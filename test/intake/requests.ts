import { createHmac } from 'node:crypto';
import { readDesk } from '../../src/desk/read-desk.ts';
import { createBackfillHandler } from '../../src/handlers/backfill.ts';
import type { HandlerDeps, LogLine } from '../../src/handlers/handler-deps.ts';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import type { UrlEvent } from '../../src/handlers/url-event.ts';
import type { Store } from '../../src/store/store.ts';
import { queues, settings } from './desk.ts';

/** A confirmation signed by Standard Webhooks 1.0.0: HMAC-SHA256 over `id.timestamp.body`, base64, after `v1,`.
 *  Written out here on its own. */
export function signedEvent(
  secret: string,
  atMs: number,
  body: string,
  requestId: string,
  id = 'msg_1',
): UrlEvent {
  const seconds = String(Math.floor(atMs / 1000));
  const key = Buffer.from(secret.slice('whsec_'.length), 'base64');
  const signature = createHmac('sha256', key).update(`${id}.${seconds}.${body}`).digest('base64');
  return {
    rawPath: '/confirmations',
    headers: {
      'content-type': 'application/json',
      'webhook-id': id,
      'webhook-timestamp': seconds,
      'webhook-signature': `v1,${signature}`,
    },
    body,
    requestContext: { requestId, http: { method: 'POST' } },
  };
}

export function formEvent(path: string, fields: unknown, requestId: string): UrlEvent {
  return {
    rawPath: path,
    headers: { 'content-type': 'application/json' },
    body: JSON.stringify(fields),
    requestContext: { requestId, http: { method: 'POST' } },
  };
}

export const secret = `whsec_${Buffer.from('24 bytes or more of secret').toString('base64')}`;
export const confirmation = JSON.stringify({
  case: { externalId: 'mail/1', team: { name: 'Billing Team' } },
  actor: { login: 'jo' },
  occurredAt: '2026-03-02T08:59:30Z',
});
export const mail =
  'From: a@b.example\r\nDate: Mon, 03 Mar 2025 10:00:00 +0100\r\nSubject: bill\r\n\r\nMy bill.\r\n';
const desk = readDesk(
  Buffer.from(
    JSON.stringify({
      version: 1,
      name: 'Fenmark Water',
      queues: [
        { id: 'billing', title: 'Billing' },
        { id: 'careers', title: 'Careers' },
      ],
      costs: { lookMinutes: 1, wrongRouteMinutes: 10 },
    }),
  ),
  'desk.json',
);
export const job = (s3Key: string) => ({
  invocationSchemaVersion: '1.0',
  invocationId: 'i1',
  job: { id: 'j1' },
  tasks: [{ taskId: 't1', s3Key }],
});

/** Both handlers over a store, with a fixed clock. */
export function open(store: Store, prefix = '') {
  const log: LogLine[] = [];
  const world = {
    store,
    nowMs: () => Date.parse('2026-03-02T09:00:00Z'),
    random: () => 0.25,
    sleep: async () => {},
  };
  const intake = createIntakeHandler({
    world,
    loadDesk: async () => ({ settings, queues, webhookSecrets: [secret] }),
    log: (line) => log.push(line),
  });
  const deps: HandlerDeps = {
    world,
    loadDesk: async () => desk,
    tokenKey: new Uint8Array(16),
    log: (line) => log.push(line),
    prefix,
  };
  return { intake, backfill: createBackfillHandler(deps), log };
}
