import { describe, expect, it } from 'vitest';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { openStation } from '../handlers/station.ts';
import { settings } from './desk.ts';
import { secret, signedEvent } from './requests.ts';

describe('one correlation id', () => {
  it('leads from the request that brought a form through its routing to its fold', async () => {
    const station = await openStation(createMemoryStore);
    const intake = createIntakeHandler({
      world: station.world,
      loadDesk: async () => ({ settings, queues: new Set(['billing']), webhookSecrets: [secret] }),
      log: station.deps.log,
    });
    const posted = await intake({
      rawPath: '/forms/contact',
      headers: { 'content-type': 'application/json' },
      body: JSON.stringify({ topic: 'bill', message: 'Please send my bill again' }),
      requestContext: { requestId: 'request-of-the-form', http: { method: 'POST' } },
    });
    const { message } = JSON.parse(posted.body);
    const key = `inbound/${message}`;
    await station.feed(station.route, key);
    const confirmed = await intake(
      signedEvent(
        secret,
        Date.now(),
        JSON.stringify({
          case: { externalId: message, team: { name: 'Billing Team' } },
          actor: { login: 'jo' },
          occurredAt: new Date(station.world.nowMs()).toISOString(),
        }),
        'request-of-the-webhook',
      ),
    );
    expect(confirmed.statusCode).toBe(202);
    const [drop] = await station.keys('confirmations/');
    await station.feed(station.confirm, drop!);

    expect(await station.metadata(key)).toMatchObject({
      'tallypost-trace': 'request-of-the-form',
      'tallypost-decision': 'held',
    });
    // The confirmation has a request of its own; the key of its drop joins the two.
    expect(station.log.map(({ event, trace, ...line }) => [event, trace, line.drop ?? line.stored])).toEqual([
      ['intake', 'request-of-the-form', key],
      ['held', 'request-of-the-form', undefined],
      ['intake', 'request-of-the-webhook', drop],
      ['confirmation-folded', 'request-of-the-form', drop],
    ]);
  });

  it('is that of the request which stored it where mail came by other ways', async () => {
    const station = await openStation(createMemoryStore);
    const key = await station.putMail('m1', 'Bill', 'my bill');
    await station.feed(station.route, key);
    await station.confirmAs('m1', 'billing');
    const { 'tallypost-trace': trace } = await station.metadata(key);
    expect(trace).toMatch(/^[0-9a-f]{12}$/);
    expect(station.log.map((line) => [line.event, line.trace])).toEqual([
      ['held', trace],
      ['confirmation-folded', trace],
    ]);
  });

  it('stays with a confirmation that is refused', async () => {
    const station = await openStation(createMemoryStore);
    const key = await station.putMail('m1', 'Bill', 'my bill');
    await station.feed(station.route, key);
    await station.confirmAs('m1', 'no-such-queue');
    const { 'tallypost-trace': trace } = await station.metadata(key);
    expect(station.log.at(-1)).toMatchObject({ event: 'confirmation-refused', code: 'queue-unknown', trace });
  });
});
