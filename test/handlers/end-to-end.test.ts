import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import type { Desk } from '../../src/desk/desk.ts';
import { schemaOf } from '../../src/features/schema-of.ts';
import { recount } from '../../src/ledger/recount.ts';
import { createDirectoryStore } from '../../src/store/directory.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { exampleDesk } from '../features/example.ts';
import { openStation, type Station, teach } from './station.ts';

const folders: string[] = [];
afterAll(() => {
  for (const folder of folders) rmSync(folder, { recursive: true, force: true });
});

const stores = {
  memory: createMemoryStore,
  directory: () => {
    const folder = mkdtempSync(join(tmpdir(), 'desk-'));
    folders.push(folder);
    return createDirectoryStore(folder);
  },
};

/** A look costs nearly as much as a wrong route, so that what is routed does not hang on the last digit of the fit. */
const eager: Desk = {
  ...exampleDesk,
  costs: { lookMinutes: 6, wrongRouteMinutes: 10 },
  queues: exampleDesk.queues.map((queue) => ({ ...queue, wrongRouteMinutes: 10 })),
  guards: [
    { id: 'danger', queue: 'leaks', phrases: ['sewage in the house'], senders: [], fields: [] },
    {
      id: 'topic-leak',
      queue: 'leaks',
      phrases: [],
      senders: [],
      fields: [{ form: 'contact', field: 'topic', values: ['A leak'] }],
    },
  ],
};

describe.each(Object.entries(stores))('on the %s store', (_name, createStore) => {
  const open = () => openStation(createStore, eager);
  const done = { batchItemFailures: [] };
  const billMail = (station: Station, name = 'bill') =>
    station.putMail(name, 'Wrong bill', 'My water bill is too high, I paid the amount already.');

  it('a message is held while nothing is learned, and routed by what was confirmed', async () => {
    const station = await open();
    const first = await station.putMail('first', 'My bill', 'The bill is too high');
    expect(await station.feed(station.route, first)).toEqual(done);
    const held = await station.metadata(first);
    expect(held).toMatchObject({
      'tallypost-decision': 'held',
      'tallypost-reason': 'nothing-learned',
      'tallypost-model': '0',
      'tallypost-at': '2026-03-02T09:00:00.000Z',
    });
    expect(held['tallypost-queue']).toBeUndefined();

    await teach(station);
    const bill = await billMail(station);
    const leak = await station.putMail('leak', 'Pipe', 'Water is leaking from a pipe in the road.');
    expect(await station.feed(station.route, bill, leak)).toEqual(done);
    const routed = await station.metadata(bill);
    expect(routed).toMatchObject({
      'tallypost-decision': 'routed',
      'tallypost-queue': 'billing',
      'tallypost-model': '12',
    });
    expect(routed['tallypost-posterior']).toMatch(/^[01]\.\d{6}$/);
    expect(['leaks', 'moving']).toContain(routed['tallypost-runner-up']);
    expect(await station.metadata(leak)).toMatchObject({
      'tallypost-decision': 'routed',
      'tallypost-queue': 'leaks',
    });
  });

  it('a compaction keeps the counts and goes on routing', async () => {
    const station = await open();
    await teach(station);
    expect((await station.compact({})).compaction).toMatchObject({
      kind: 'compacted',
      messages: 12,
      segments: 12,
    });
    const bill = await billMail(station);
    await station.feed(station.route, bill);
    expect(await station.metadata(bill)).toMatchObject({
      'tallypost-decision': 'routed',
      'tallypost-queue': 'billing',
      'tallypost-model': '13',
    });
  });

  it('a guard sends where it must, whatever the model says', async () => {
    const station = await open();
    const mail = await station.putMail('flood', 'Help', 'There is SEWAGE\nin the house!');
    const form = await station.putForm('f1', {
      form: 'contact',
      fields: { topic: 'a leak', details: 'my bill' },
    });
    await station.feed(station.route, mail, form);
    expect(await station.metadata(mail)).toMatchObject({
      'tallypost-decision': 'guarded',
      'tallypost-queue': 'leaks',
      'tallypost-reason': 'danger',
    });
    expect(await station.metadata(form)).toMatchObject({ 'tallypost-reason': 'topic-leak' });
  });

  it('forms are routed like mail', async () => {
    const station = await open();
    await teach(station);
    const form = await station.putForm('f1', {
      form: 'contact',
      at: '2026-03-02T08:00:00Z',
      fields: { topic: 'A bill', details: 'I was charged twice, please refund the payment of my bill' },
    });
    await station.feed(station.route, form);
    expect(await station.metadata(form)).toMatchObject({
      'tallypost-decision': 'routed',
      'tallypost-queue': 'billing',
    });
  });

  it('repeated delivery of a message changes nothing, also when the model has moved on', async () => {
    const station = await open();
    const bill = await billMail(station);
    await station.feed(station.route, bill);
    const before = await station.store.head(bill);
    await teach(station);
    expect(await station.feed(station.route, bill, bill)).toEqual(done);
    expect(await station.store.head(bill)).toEqual(before);
    expect(station.log.filter(({ event }) => event === 'decided-already')).toHaveLength(2);
  });

  it('metadata of others, body and content type stay', async () => {
    const station = await open();
    const key = 'inbound/with-metadata';
    const body = new TextEncoder().encode('Subject: Hello\r\n\r\nA bill');
    await station.store.put(key, body, { contentType: 'message/rfc822', metadata: { received: 'smtp-7' } });
    await station.feed(station.route, key);
    const head = await station.store.head(key);
    expect(head).toMatchObject({ contentType: 'message/rfc822', bytes: body.length });
    expect(head!.metadata).toMatchObject({ received: 'smtp-7', 'tallypost-decision': 'held' });
  });

  it('a confirmation is folded and its drop deleted, and a repeated delivery of it does nothing', async () => {
    const station = await open();
    const key = await billMail(station);
    await station.feed(station.route, key);
    const drop = await station.putDrop('d1', {
      message: 'bill',
      queue: 'billing',
      by: 'a.tolland',
      at: '2026-03-02T09:00:00Z',
    });
    expect(await station.feed(station.confirm, drop)).toEqual(done);
    expect(await station.keys('confirmations')).toEqual([]);
    const manifest = await station.json('model/manifest.json');
    expect(manifest).toMatchObject({ version: 1, segments: [{}] });
    expect(await station.feed(station.confirm, drop)).toEqual(done);
    expect(await station.json('model/manifest.json')).toEqual(manifest);
  });

  it('the same confirmation dropped again counts once', async () => {
    const station = await open();
    await billMail(station);
    const said = { message: 'bill', queue: 'billing', by: 'a.tolland', at: '2026-03-02T09:00:00Z' };
    await station.feed(station.confirm, await station.putDrop('d1', said));
    await station.feed(station.confirm, await station.putDrop('d2', said));
    expect(await station.keys('confirmations')).toEqual([]);
    expect(station.log.map(({ event }) => event)).toEqual(['confirmation-folded', 'confirmation-already']);
    expect(await station.json('model/manifest.json')).toMatchObject({ version: 1 });
  });

  it('a correction moves the message to the other queue, and the table equals the recount', async () => {
    const station = await open();
    await teach(station);
    await billMail(station);
    await station.confirmAs('bill', 'leaks');
    await station.confirmAs('bill', 'billing', 'b.marsh');
    const compacted = await station.compact({});
    expect(compacted.compaction).toMatchObject({ kind: 'compacted', messages: 13 });
    const { desk, schema } = await deskAndSchema(station);
    expect(await recount(station.world, desk, schema)).toMatchObject({ differences: [] });
    const again = await billMail(station, 'again');
    await station.feed(station.route, again);
    expect(await station.metadata(again)).toMatchObject({ 'tallypost-queue': 'billing' });
  });

  it('an older confirmation that comes late does not overwrite a newer one', async () => {
    const station = await open();
    await billMail(station);
    station.pass(60_000);
    const drop = (name: string, queue: string, at: string) =>
      station.putDrop(name, { message: 'bill', queue, by: 'a.tolland', at });
    await station.feed(station.confirm, await drop('new', 'billing', '2026-03-02T09:00:30Z'));
    await station.feed(station.confirm, await drop('old', 'leaks', '2026-03-02T09:00:10Z'));
    expect(station.log.at(-1)).toMatchObject({ event: 'confirmation-stale', message: 'bill' });
    expect(await station.keys('confirmations')).toEqual([]);
    const history = (await station.json('histories/bill.json')) as { placements: { queue: string }[] };
    expect(history.placements.map(({ queue }) => queue)).toEqual(['billing']);
  });

  it('a message whose raw mail is gone can still be corrected', async () => {
    const station = await open();
    const key = await billMail(station);
    await station.confirmAs('bill', 'leaks');
    await station.store.delete(key);
    expect(await station.confirmAs('bill', 'billing')).toEqual(done);
    expect(station.log.at(-1)).toMatchObject({ event: 'confirmation-folded', queue: 'billing' });
  });

  it('what was said at routing is kept with the message, and its trace leads to the fold', async () => {
    const station = await open();
    await teach(station);
    const key = await billMail(station);
    await station.feed(station.route, key);
    const written = await station.metadata(key);
    await station.confirmAs('bill', 'billing');
    const history = (await station.json('histories/bill.json')) as { said: unknown };
    expect(history.said).toEqual({
      queue: 'billing',
      posterior: Number(written['tallypost-posterior']),
      isAudit: false,
    });
    const traces = station.log
      .filter(({ message }) => message === 'bill')
      .map(({ event, trace }) => [event, trace]);
    expect(traces).toEqual([
      ['routed', written['tallypost-trace']],
      ['confirmation-folded', written['tallypost-trace']],
    ]);
  });

  it('drops that lay for over an hour are folded by the compaction, younger ones are left to their event', async () => {
    const station = await openStation(createStore, eager);
    await billMail(station);
    await station.putDrop('lost', { message: 'bill', queue: 'billing', by: 'a', at: '2026-03-02T09:00:00Z' });
    const storedAtMs = (await station.store.head('confirmations/lost.json'))!.modifiedAtMs;
    station.pass(storedAtMs - station.world.nowMs() + 59 * 60_000);
    expect(await station.compact({})).toMatchObject({ leftDrops: { done: 0, remaining: 0 } });
    station.pass(2 * 60_000);
    expect(await station.compact({})).toMatchObject({
      leftDrops: { done: 1, remaining: 0 },
      compaction: { kind: 'compacted', messages: 1 },
    });
    expect(await station.keys('confirmations')).toEqual([]);
  });
});

async function deskAndSchema(station: Station) {
  const desk = await station.deps.loadDesk();
  return { desk, schema: schemaOf(desk, station.deps.tokenKey) };
}
