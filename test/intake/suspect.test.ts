import { describe, expect, it } from 'vitest';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import { exampleDesk } from '../features/example.ts';
import { openStation, type Station, teach } from '../handlers/station.ts';
import { settings } from './desk.ts';

const desk = {
  ...exampleDesk,
  // A look costs nearly as much as a wrong route: what is not held for another reason is routed.
  costs: { lookMinutes: 6, wrongRouteMinutes: 10 },
  queues: exampleDesk.queues.map((queue) => ({ ...queue, wrongRouteMinutes: 10 })),
  guards: [{ id: 'danger', queue: 'leaks', phrases: ['danger to life'], senders: [], fields: [] }],
};

/** Posts a form to the intake over the station's store, and routes what it stored; gives the metadata. */
async function postAndRoute(station: Station, fields: Record<string, unknown>) {
  const handle = createIntakeHandler({
    world: station.world,
    loadDesk: async () => ({ settings, queues: new Set(['billing']), webhookSecrets: [] }),
    log: station.deps.log,
  });
  const result = await handle({
    rawPath: '/forms/contact',
    headers: { 'content-type': 'application/json' },
    body: JSON.stringify(fields),
    requestContext: { requestId: 'request-7', http: { method: 'POST' } },
  });
  const key = `inbound/${JSON.parse(result.body).message}`;
  await station.feed(station.route, key);
  return station.metadata(key);
}

const bill = { topic: 'bill', message: 'I was charged twice, please refund the payment of my bill' };

describe('a form that looks as if a program had sent it', () => {
  it('is held as suspect with the queue it would have gone to, where the same form from a person is routed', async () => {
    const station = await openStation(undefined, desk);
    await teach(station);
    expect(await postAndRoute(station, bill)).toMatchObject({
      'tallypost-decision': 'routed',
      'tallypost-queue': 'billing',
    });
    for (const trick of [{ website: 'https://pills.test' }, { shownAt: station.world.nowMs() - 500 }]) {
      expect(await postAndRoute(station, { ...bill, ...trick })).toMatchObject({
        'tallypost-decision': 'held',
        'tallypost-reason': 'suspect',
        'tallypost-queue': 'billing',
      });
    }
  });

  it('still meets a guard: danger goes before suspicion', async () => {
    const station = await openStation(undefined, desk);
    const message = 'There is danger to life here';
    expect(await postAndRoute(station, { topic: 'leak', message, website: 'x' })).toMatchObject({
      'tallypost-decision': 'guarded',
      'tallypost-reason': 'danger',
    });
  });
});
