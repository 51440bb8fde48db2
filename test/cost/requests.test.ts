import { describe, expect, it } from 'vitest';
import { machineOfTemplate } from '../../src/cost/load.ts';
import { requests } from '../../src/cost/monthly-cost.ts';
import { createCompactHandler } from '../../src/handlers/compact.ts';
import { createConfirmHandler } from '../../src/handlers/confirm.ts';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import { createRouteHandler } from '../../src/handlers/route.ts';
import { documentsOf } from '../../src/metrics/emf.ts';
import type { Measurement } from '../../src/metrics/measurement.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { openStation } from '../handlers/station.ts';
import { settings } from '../intake/desk.ts';
import { formEvent, secret, signedEvent } from '../intake/requests.ts';

/** A memory store that counts what its calls cost on S3; `take` gives the counts since it was last asked. */
function createCounted() {
  let reads = 0;
  let writes = 0;
  const store = createMemoryStore();
  const counted: Store = {
    ...store,
    get: (...given) => {
      reads += 1;
      return store.get(...given);
    },
    stream: (key) => {
      reads += 1;
      return store.stream(key);
    },
    head: (key) => {
      reads += 1;
      return store.head(key);
    },
    put: (...given) => {
      writes += 1;
      return store.put(...given);
    },
    list: (...given) => {
      writes += 1;
      return store.list(...given);
    },
    // A head, then the copy.
    replaceMetadata: (...given) => {
      reads += 1;
      writes += 1;
      return store.replaceMetadata(...given);
    },
  };
  const take = () => {
    const taken = { reads, writes };
    [reads, writes] = [0, 0];
    return taken;
  };
  return { store: counted, take };
}

async function open() {
  const { store, take } = createCounted();
  const station = await openStation(() => store);
  const measured: Measurement[] = [];
  const deps = { ...station.deps, measure: (more: readonly Measurement[]) => void measured.push(...more) };
  const intake = createIntakeHandler({
    world: station.world,
    loadDesk: async () => ({ settings, queues: new Set(['billing']), webhookSecrets: [secret] }),
    log: station.deps.log,
  });
  await deps.loadDesk();
  const handlers = { route: createRouteHandler(deps), confirm: createConfirmHandler(deps), intake };
  return { station, take, measured, compact: createCompactHandler(deps), ...handlers };
}

const times = (each: { readonly reads: number; readonly writes: number }, n: number) => ({
  reads: each.reads * n,
  writes: each.writes * n,
});
const plus = (...all: { readonly reads: number; readonly writes: number }[]) =>
  all.reduce((sum, each) => ({ reads: sum.reads + each.reads, writes: sum.writes + each.writes }));

describe('the requests that a month’s cost is computed from are those that the handlers make', () => {
  it('for routing: by the message and by the batch', async () => {
    const { station, take, route } = await open();
    const names = Array.from({ length: 10 }, (_, i) => `m${i}`);
    const mails = await Promise.all(names.map((name) => station.putMail(name, 'Bill', `my bill ${name}`)));
    take();
    await station.feed(route, ...mails);
    expect(take()).toEqual(plus(times(requests.message, 10), requests.routeBatch));
  });

  it('for the intake: by the form and by the webhook', async () => {
    const { intake, take } = await open();
    take();
    await intake(formEvent('/forms/contact', { topic: 'bill', message: 'my bill' }, 'r1'));
    expect(take()).toEqual(requests.form);
    const body = JSON.stringify({
      case: { externalId: 'm1', team: { name: 'billing' } },
      actor: { login: 'jo' },
      occurredAt: '2026-03-02T09:00:00Z',
    });
    expect((await intake(signedEvent(secret, Date.now(), body, 'r2'))).statusCode).toBe(202);
    expect(take()).toEqual(requests.webhook);
  });

  it('for folding: by the confirmation and by the batch, beside a base', async () => {
    const { station, take, confirm, compact } = await open();
    const drop = (i: number) => ({
      message: `m${i}`,
      queue: 'billing',
      by: 'jo',
      at: '2026-03-02T08:59:00Z',
    });
    for (let i = 0; i < 12; i++) await station.putMail(`m${i}`, 'Bill', `my bill ${i}`);
    await station.feed(confirm, await station.putDrop('d0', drop(0)), await station.putDrop('d1', drop(1)));
    await compact({});
    const drops: string[] = [];
    for (let i = 2; i < 12; i++) drops.push(await station.putDrop(`d${i}`, drop(i)));
    take();
    await station.feed(confirm, ...drops);
    expect(take()).toEqual(plus(times(requests.confirmation, 10), requests.foldOfNew));
    // Where their segments are is told by the manifest alone while they stand beside the base.
    const corrected = (i: number) => ({ ...drop(i), queue: 'leaks', at: '2026-03-02T08:59:30Z' });
    const beside = [await station.putDrop('e2', corrected(2)), await station.putDrop('e3', corrected(3))];
    take();
    await station.feed(confirm, ...beside);
    expect(take()).toEqual(plus(times(requests.confirmation, 2), requests.foldOfNew));
    const absorbed = [await station.putDrop('e0', corrected(0)), await station.putDrop('e1', corrected(1))];
    take();
    await station.feed(confirm, ...absorbed);
    expect(take()).toEqual(plus(times(requests.confirmation, 2), requests.fold));
  });
});

describe('the bytes of log that a month’s cost is computed from', () => {
  /** Lines end with a line feed, and Lambda's environment puts a time before ours: 36 bytes. */
  const meanBytes = (lines: readonly unknown[]) =>
    lines.reduce((sum: number, line) => sum + JSON.stringify(line).length + 37, 0) / lines.length;

  it('are at least what the handlers write, and at most twice that', async () => {
    const { station, measured, route, confirm, intake } = await open();
    const keys = await Promise.all(
      // As long as the receiving service's ids.
      ['a', 'b', 'c'].map((name) =>
        station.putMail(`mail/${name.repeat(40)}`, 'Wrong bill', 'My bill is too high, I paid the payment.'),
      ),
    );
    await station.feed(route, ...keys);
    const ofLines = (event: string) => station.log.filter((line) => line.event === event);
    const drops = await Promise.all(
      keys.map((key, i) =>
        station.putDrop(`webhook-${String(i).repeat(64)}`, {
          message: key.slice('inbound/'.length),
          queue: 'billing',
          by: 'jo',
          at: '2026-03-02T08:59:00Z',
        }),
      ),
    );
    await station.feed(confirm, ...drops);
    const fresh = await Promise.all(
      ['d', 'e'].map((name) => station.putMail(`mail/${name.repeat(40)}`, 'Bill', 'My bill')),
    );
    await station.feed(route, ...fresh);
    await intake(
      formEvent(
        '/forms/contact',
        { topic: 'bill', message: 'my bill' },
        '00000000-0000-4000-8000-000000000001',
      ),
    );
    const documents = documentsOf(measured, 'tallypost-desk-000000000000-eu-west-2', 1772442000000);
    const routed = station.log.filter(({ event }) => event === 'routed' || event === 'held');
    const queueDocument = documentsOf(
      [{ queue: 'leaks-and-bursts', values: { ToQueue: [3] } }],
      'tallypost-desk-000000000000-eu-west-2',
      1772442000000,
    );
    for (const [assumed, lines] of [
      [machineOfTemplate.routeLineBytes, routed],
      [machineOfTemplate.confirmLineBytes, ofLines('confirmation-folded')],
      [machineOfTemplate.intakeLineBytes, ofLines('intake')],
      [machineOfTemplate.metricLineBytes, documents.filter((one) => one.Queue === undefined)],
      [machineOfTemplate.queueLineBytes, queueDocument],
    ] as const) {
      expect(lines.length).toBeGreaterThan(0);
      const mean = meanBytes(lines);
      expect(assumed).toBeGreaterThanOrEqual(mean);
      expect(assumed).toBeLessThanOrEqual(2 * mean);
    }
  });
});
