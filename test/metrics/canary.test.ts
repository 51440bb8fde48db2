import { afterEach, beforeEach, describe, expect, it, vi } from 'vitest';
import { createCompactHandler } from '../../src/handlers/compact.ts';
import { createConfirmHandler } from '../../src/handlers/confirm.ts';
import type { HandlerDeps } from '../../src/handlers/handler-deps.ts';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import { faultMembers } from '../../src/handlers/log-fault.ts';
import { createRouteHandler } from '../../src/handlers/route.ts';
import { documentsOf } from '../../src/metrics/emf.ts';
import type { Measurement } from '../../src/metrics/measurement.ts';
import { keys } from '../../src/store/keys.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { exampleDesk } from '../features/example.ts';
import { openStation, type Station, teach } from '../handlers/station.ts';
import { settings } from '../intake/desk.ts';
import { formEvent, secret, signedEvent } from '../intake/requests.ts';

/** What a customer writes carries this in every field, each time with the field's own number: none of it may turn up in
 *  anything but the raw message. Letters only, so that it passes for a word everywhere. */
const root = 'qzcanary';
let planted = 0;
const word = (): string => {
  planted += 1;
  return `${root}${[...String(planted)].map((digit) => 'abcdefghij'[Number(digit)]).join('')}`;
};

const printed: string[] = [];
beforeEach(() => {
  printed.length = 0;
  const keep = (chunk: unknown) => printed.push(String(chunk)) > 0;
  vi.spyOn(process.stdout, 'write').mockImplementation(keep);
  vi.spyOn(process.stderr, 'write').mockImplementation(keep);
  for (const name of ['log', 'info', 'warn', 'error', 'debug'] as const)
    vi.spyOn(console, name).mockImplementation((...args) => void printed.push(args.join(' ')));
});
afterEach(() => {
  vi.restoreAllMocks();
});

/** Every text that bytes may be read as: UTF-8, UTF-16, and what stands in base64 inside either. */
function readings(bytes: Uint8Array): string {
  const buffer = Buffer.from(bytes);
  const utf8 = buffer.toString('utf8');
  const encoded = [...utf8.matchAll(/[A-Za-z0-9+/]{16,}={0,2}/g)].map(([text]) =>
    Buffer.from(text, 'base64'),
  );
  const all = [buffer, ...encoded].flatMap((each) => [each.toString('utf8'), each.toString('utf16le')]);
  return all.join('\n').toLowerCase();
}

/** Where a canary is seen, by object key, `metadata of …` or `log`. */
async function sightings(store: Store, written: readonly unknown[]): Promise<string[]> {
  const seen: string[] = [];
  const look = (place: string, text: string) => {
    if (text.toLowerCase().includes(root)) seen.push(place);
  };
  for await (const { key } of store.list('')) {
    look(`the key ${key}`, key);
    const got = await store.get(key);
    if (got.kind !== 'found') continue;
    look(`metadata of ${key}`, JSON.stringify(got.object.metadata));
    look(key, readings(got.object.body));
  }
  for (const each of written) look('log', JSON.stringify(each));
  look('output', printed.join(''));
  return seen;
}

const isRaw = (place: string) => place.startsWith(keys.inbound);

function mailWithCanaries(): string {
  const w = word;
  return [
    `Received: from ${w()}.test by mx.fenmarkwater.example; Mon, 2 Mar 2026 09:00:00 +0000 (${w()})`,
    `From: "${w()} ${w()}" <${w()}@${w()}.test>`,
    `Reply-To: ${w()}@${w()}.test`,
    `Sender: ${w()}@${w()}.test`,
    `To: ${w()} <help@fenmarkwater.example>, ${w()}@${w()}.test`,
    `Cc: =?utf-8?q?${w()}?= <${w()}@${w()}.test>`,
    `Subject: bill ${w()} =?utf-8?b?${Buffer.from(w()).toString('base64')}?= ${w()}`,
    `Date: Mon, 2 Mar 2026 09:00:00 +0000 (${w()})`,
    `Message-ID: <${w()}@${w()}.test>`,
    `In-Reply-To: <${w()}@${w()}.test>`,
    `References: <${w()}@${w()}.test> <${w()}@${w()}.test>`,
    `List-Id: ${w()} <${w()}.test>`,
    `X-${w()}: ${w()}`,
    `User-Agent: ${w()}`,
    'MIME-Version: 1.0',
    `Content-Type: multipart/mixed; boundary="${w()}x"; ${w()}=${w()}`,
  ].join('\r\n');
}

/** Parts as a client writes them; one of each kind that is read another way. */
function partsWithCanaries(boundary: string): string {
  const w = word;
  return [
    `Preamble ${w()}`,
    `--${boundary}`,
    `Content-Type: text/plain; charset=utf-8; name="${w()}"`,
    `Content-ID: <${w()}>`,
    `Content-Description: ${w()}`,
    '',
    `My bill is too high, I paid the payment of ${w()} and ${w()} already. https://${w()}.test/${w()}?${w()}=${w()}`,
    `account FW-12345678 ${w()} ${w()}@${w()}.test`,
    '',
    `On Monday ${w()} wrote:`,
    `> ${w()} quoted`,
    '-- ',
    `${w()} signature`,
    `--${boundary}`,
    'Content-Type: text/html; charset=iso-8859-1',
    'Content-Transfer-Encoding: quoted-printable',
    '',
    `<html><head><title>${w()}</title><style>.${w()}{display:none}</style></head><body class=3D"${w()}">`,
    `<p title=3D"${w()}">${w()} <b>${w()}</b> <!-- ${w()} --><img alt=3D"${w()}" src=3D"cid:${w()}"></p></body></html>`,
    `--${boundary}`,
    `Content-Type: application/pdf; name="${w()}.pdf"`,
    `Content-Disposition: attachment; filename="${w()}.pdf"; filename*=utf-8''${w()}.pdf`,
    'Content-Transfer-Encoding: base64',
    '',
    Buffer.from(`%PDF ${w()}`).toString('base64'),
    `--${boundary}`,
    'Content-Type: message/rfc822',
    '',
    `Subject: ${w()}`,
    '',
    `${w()} inner`,
    `--${boundary}`,
    `Content-Type: text/plain; charset=${w()}`,
    `Content-Transfer-Encoding: ${w()}`,
    '',
    `${w()}`,
    `--${boundary}--`,
    `Epilogue ${w()}`,
    '',
  ].join('\r\n');
}

function wholeMail(): string {
  const head = mailWithCanaries();
  const boundary = /boundary="([^"]+)"/.exec(head)![1]!;
  return `${head}\r\n\r\n${partsWithCanaries(boundary)}`;
}

const formWithCanaries = () => ({
  form: word(),
  at: '2026-03-02T08:00:00Z',
  from: `${word()}@${word()}.test`,
  suspicion: word(),
  fields: {
    topic: `bill ${word()}`,
    [word()]: word(),
    details: `my bill ${word()}\n\n${word()}`,
    list: [word()],
  },
  [word()]: word(),
});

async function openWatched(createStore: () => Store = createMemoryStore) {
  const station = await openStation(createStore, {
    ...exampleDesk,
    costs: { lookMinutes: 6, wrongRouteMinutes: 10 },
    halfLifeDays: 60,
  });
  const measured: Measurement[] = [];
  const deps: HandlerDeps = { ...station.deps, measure: (more) => void measured.push(...more) };
  const intake = createIntakeHandler({
    world: station.world,
    loadDesk: async () => ({ settings, queues: new Set(['billing']), webhookSecrets: [secret] }),
    log: station.deps.log,
  });
  const written = () => [...station.log, ...documentsOf(measured, 'desk', 0)];
  return {
    station,
    intake,
    written,
    route: createRouteHandler(deps),
    confirm: createConfirmHandler(deps),
    compact: createCompactHandler(deps),
  };
}

const put = async (station: Station, key: string, body: string) => {
  await station.store.put(key, Buffer.from(body));
  return key;
};

describe('customers’ words', () => {
  it('are planted where they can be found: the search sees all raw messages', async () => {
    const { station } = await openWatched();
    await put(station, 'inbound/m1', wholeMail());
    await put(station, 'inbound/f1.json', JSON.stringify(formWithCanaries()));
    const inBase64 = Buffer.from(`in base 64: ${word()}`).toString('base64');
    await put(station, 'model/segments/x', `{"features":"${inBase64}"}`);
    await station.store.put('reports/x', Buffer.from('x'), { metadata: { note: word() } });
    const seen = await sightings(station.store, [{ event: 'x', note: word() }]);
    expect(seen).toEqual([
      'inbound/f1.json',
      'inbound/m1',
      'model/segments/x',
      'metadata of reports/x',
      'log',
    ]);
  });

  it('reach no log, metric, metadata, table, segment or history on the way from message to table', async () => {
    const { station, intake, route, confirm, compact, written } = await openWatched();
    await teach(station);
    await put(station, 'inbound/m1', wholeMail());
    await put(station, 'inbound/f1.json', JSON.stringify(formWithCanaries()));
    const posted = await intake(
      formEvent(
        '/forms/contact',
        { topic: 'bill', email: `${word()}@${word()}.test`, message: `bill ${word()}` },
        'r1',
      ),
    );
    const form: string = JSON.parse(posted.body).message;
    const messages = ['m1', 'f1.json', form];
    await station.feed(route, ...messages.map((message) => keys.inbound + message));
    for (const message of messages)
      expect((await station.metadata(keys.inbound + message))['tallypost-decision']).toBeDefined();
    for (const message of messages) {
      // The helpdesk's document has the customer's words beside what is mapped.
      const event = signedEvent(
        secret,
        Date.now(),
        JSON.stringify({
          case: { externalId: message, team: { name: 'Billing Team' }, subject: word(), body: word() },
          actor: { login: 'jo' },
          occurredAt: new Date(station.world.nowMs()).toISOString(),
        }),
        'r2',
        `id-of-${message}`,
      );
      expect((await intake(event)).statusCode).toBe(202);
    }
    await station.feed(confirm, ...(await station.keys(keys.confirmations)));
    await station.feed(
      confirm,
      await station.putDrop('again', {
        message: 'm1',
        queue: 'moving',
        by: 'al',
        at: '2026-03-02T09:00:30Z',
      }),
    );
    expect(station.log.filter(({ event }) => event === 'confirmation-folded')).toHaveLength(12 + 3 + 1);
    const { compaction, recount } = await compact({ recount: true });
    expect([compaction.kind, compaction.messages, recount]).toMatchObject([
      'compacted',
      15,
      { differences: 0 },
    ]);

    expect(await station.keys('model/tables')).toHaveLength(1);
    expect(await station.keys('histories/')).toHaveLength(15);
    const seen = await sightings(station.store, written());
    expect(seen.filter(isRaw).sort()).toEqual(messages.map((message) => keys.inbound + message).sort());
    expect(seen.filter((place) => !isRaw(place))).toEqual([]);
  });

  it('stay out of what is written when messages cannot be read', async () => {
    const { station, route, written } = await openWatched();
    const broken = await Promise.all([
      put(station, 'inbound/b1.json', `{"form":"${word()}`),
      put(station, 'inbound/b2.json', `["${word()}"]`),
      put(
        station,
        'inbound/b3.json',
        JSON.stringify({
          fields: { [`${word()} ${word()}`]: { [word()]: word() } },
          at: word(),
          from: word(),
        }),
      ),
      put(station, 'inbound/b4', `${word()}`),
      put(
        station,
        'inbound/b5',
        `Subject ${word()}\r\n${word()}: ${word()}\r\nDate: ${word()}\r\nFrom: ${word()}\r\n\r\n${word()}`,
      ),
      put(
        station,
        'inbound/b6',
        `Content-Type: multipart/${word()}; boundary=\r\n\r\n--${word()}\r\n\r\n${word()}`,
      ),
      put(
        station,
        'inbound/b7',
        `Subject: =?${word()}?x?${word()}?=\r\nContent-Type: ${word()}\r\n\r\n${word()}`,
      ),
      put(station, 'inbound/b8', `Subject: ${word()}\r\n\r\n${`${word()}\u0000\u202e`.repeat(50)}`),
    ]);
    expect(await station.feed(route, ...broken)).toEqual({ batchItemFailures: [] });
    const seen = await sightings(station.store, written());
    expect(seen.filter(isRaw)).toHaveLength(8);
    expect(seen.filter((place) => !isRaw(place))).toEqual([]);
  });

  it('stay out of what is written when the store fails with an error that repeats them', async () => {
    let failing: keyof Store | null = null;
    const fail = async () => {
      const error = new Error(`${word()}\n    at ${word()} (${word()}:1:1)`);
      throw Object.assign(error, { cause: new Error(word()), detail: word() });
    };
    const { station, intake, route, confirm, compact, written } = await openWatched(() => {
      const store = createMemoryStore();
      const wrap = <F extends (...args: never[]) => Promise<unknown>>(name: keyof Store, real: F): F =>
        ((...args: Parameters<F>) => (failing === name ? fail() : real(...args))) as F;
      return {
        ...store,
        get: wrap('get', store.get),
        head: wrap('head', store.head),
        put: wrap('put', store.put),
        delete: wrap('delete', store.delete),
        stream: wrap('stream', store.stream),
        replaceMetadata: wrap('replaceMetadata', store.replaceMetadata),
      };
    });
    const mail = await put(station, 'inbound/m1', wholeMail());
    const dropped = await station.putDrop('d1', {
      message: 'm1',
      queue: 'billing',
      by: 'jo',
      at: '2026-03-02T08:59:00Z',
    });
    const thrown: unknown[] = [];
    for (const name of ['stream', 'get', 'put', 'replaceMetadata', 'delete', 'head'] as const) {
      failing = name;
      await station.feed(route, mail);
      await station.feed(confirm, dropped);
      await intake(formEvent('/forms/contact', { topic: 'bill', message: word() }, 'r1'));
      await intake(signedEvent(secret, Date.now(), JSON.stringify({ case: word() }), 'r2'));
      failing = null;
      thrown.push(await station.feed(route, mail));
    }
    failing = 'get';
    await expect(compact({})).rejects.toThrow();
    failing = null;
    const events = new Set(station.log.filter(({ level }) => level !== 'info').map(({ event }) => event));
    for (const event of ['route-failed', 'confirmation-failed', 'intake', 'compaction-failed'])
      expect(events).toContain(event);
    const seen = await sightings(station.store, [...written(), ...thrown]);
    expect(seen.filter((place) => !isRaw(place))).toEqual([]);
  });

  it('stay out of the log when a helpdesk puts them where something else belongs', async () => {
    const { station, intake, confirm, written } = await openWatched();
    await put(station, 'inbound/m1', wholeMail());
    const good = { message: 'm1', queue: 'billing', by: 'jo', at: '2026-03-02T08:59:00Z' };
    const drops = [
      `{"message": "m1", ${word()}`,
      { ...good, [word()]: word() },
      { ...good, queue: word() },
      { ...good, queue: `${word()}\n${word()}` },
      { ...good, by: `${word()}\n` },
      { ...good, at: word() },
      { ...good, message: `${word()}\n${word()}` },
      { ...good, message: { [word()]: word() } },
    ];
    const dropped = await Promise.all(drops.map((drop, i) => station.putDrop(`d${i}`, drop)));
    await station.feed(confirm, ...dropped);
    expect(station.log.filter(({ event }) => event === 'confirmation-refused')).toHaveLength(drops.length);
    for (const event of [
      formEvent(`/forms/${word()}`, {}, 'r1'),
      formEvent(`/${word()}/${word()}`, {}, 'r1'),
      formEvent('/forms/contact', { topic: word(), [word()]: word() }, 'r1'),
      formEvent('/forms/contact', [word()], 'r1'),
      { ...formEvent('/forms/contact', {}, 'r1'), body: `{"${word()}` },
      {
        ...formEvent('/forms/contact', {}, 'r1'),
        headers: { origin: `https://${word()}.test`, [word()]: word() },
      },
      {
        ...formEvent('/forms/contact', {}, word()),
        requestContext: { requestId: `${word()}\n`, http: { method: word() } },
      },
      { ...formEvent('/confirmations', { [word()]: word() }, 'r1'), headers: { 'webhook-id': word() } },
      signedEvent(
        secret,
        Date.now(),
        JSON.stringify({ case: { externalId: `${word()}\n` }, actor: word() }),
        'r1',
      ),
    ])
      expect((await intake(event)).statusCode).toBeGreaterThanOrEqual(400);
    // The refused drops themselves are kept, with what is wrong with them, for the people who look after the helpdesk.
    const seen = await sightings(station.store, written());
    expect(seen.filter((place) => !isRaw(place) && !place.startsWith(keys.refusedConfirmations))).toEqual([]);
  });

  it('stay out of a logged error whose message looks like a stack', () => {
    const error = new TypeError(`unexpected ${word()}\n    at ${word()} (file:///${word()}.js:1:2)`);
    const members = faultMembers(error);
    expect(JSON.stringify(members)).not.toContain(root);
    expect((members.frames as string[])[0]).toMatch(/^at .*canary\.test\.ts/);
  });
});
