import { expect, it } from 'vitest';
import { createExtractor } from '../../src/features/extractor.ts';
import { parseMail } from '../../src/message/mail.ts';
import { encodeFeatures } from '../../src/model/codec-entries.ts';
import { collectReport } from '../../src/report/collect.ts';
import { reportPage } from '../../src/report/report-page.ts';
import type { ObjectHead, Store } from '../../src/store/store.ts';
import { lessons, openStation, teach } from '../handlers/station.ts';

const total = 1_000_000;
const minuteMs = 60_000;

/** A desk with a million messages, of which two in three are confirmed and one in five of those moved: heads and histories are
 *  made when they are asked for, so that only what the report reads takes time. */
it('the report of a million messages reads no more than its bound, and makes a page of less than 300 KB', async () => {
  const station = await openStation();
  await teach(station);
  await station.compact({});
  const desk = await station.deps.loadDesk();
  const extractor = createExtractor(desk, station.deps.tokenKey);
  const nowMs = station.world.nowMs();
  const features = await Promise.all(
    lessons.map(async ([, subject, text]) =>
      encodeFeatures(
        extractor.extract(
          await parseMail(Buffer.from(`Subject: ${subject}\r\n\r\n${text}\r\n`), { nowMs: () => nowMs }),
        ),
      ),
    ),
  );
  const queues = desk.queues.map(({ id }) => id);
  const atMsOf = (i: number) => nowMs - (total - i) * minuteMs;
  const queueOf = (i: number) => queues[i % queues.length] as string;
  const idOf = (i: number) => `mail/${String(i).padStart(7, '0')}`;
  const headOf = (i: number): ObjectHead => ({
    key: `inbound/${idOf(i)}`,
    etag: `"${i}"`,
    bytes: 1000,
    modifiedAtMs: atMsOf(i),
    contentType: 'message/rfc822',
    metadata: {
      'tallypost-decision': i % 4 === 0 ? 'held' : 'routed',
      'tallypost-reason': 'unsure',
      'tallypost-queue': queueOf(i),
      'tallypost-posterior': (0.5 + (i % 50) / 100).toFixed(4),
      'tallypost-at': new Date(atMsOf(i)).toISOString(),
    },
  });
  const historyOf = (i: number) => {
    const queue = queueOf(i % 5 === 0 ? i + 1 : i);
    const at = new Date(atMsOf(i) + minuteMs).toISOString();
    return Buffer.from(
      JSON.stringify({
        ...template,
        message: idOf(i),
        features: { [extractor.schema.id]: features[i % features.length] },
        confirmations: [{ ...template.confirmations[0], message: idOf(i), queue, by: 'jo', at }],
      }),
    );
  };
  const template = (await station.json('histories/lesson-0.json')) as {
    confirmations: Record<string, unknown>[];
  };
  let reads = 0;
  const numberIn = (key: string) => Number(/mail\/(\d{7})/.exec(key)?.[1] ?? Number.NaN);
  const store: Store = {
    ...station.store,
    async *list(prefix, options) {
      if (prefix !== 'inbound/') yield* station.store.list(prefix, options);
      else for (let i = 0; i < total; i += 1) yield listedOf(i);
    },
    async head(key) {
      reads += 1;
      const i = numberIn(key);
      return Number.isNaN(i) ? station.store.head(key) : headOf(i);
    },
    async get(key, options) {
      reads += 1;
      const i = numberIn(key);
      if (Number.isNaN(i)) return station.store.get(key, options);
      if (i % 3 === 0) return { kind: 'missing' };
      const body = historyOf(i);
      return { kind: 'found', object: { ...headOf(i), key, bytes: body.length, body } };
    },
  };
  /** What a listing tells, made without the rest. */
  const listedOf = (i: number) => ({
    key: `inbound/${idOf(i)}`,
    etag: '""',
    bytes: 1000,
    modifiedAtMs: atMsOf(i),
  });
  const data = await collectReport({ ...station.world, store }, desk, extractor, {
    readMessage: async () => null,
  });
  expect(data.looked).toMatchObject({ messages: 5000, isAll: false });
  // Of each three messages two are confirmed.
  expect(data.looked.confirmed).toBeGreaterThan(3300);
  expect(data.corrections.pairs.length).toBeGreaterThan(0);
  expect(data.health.recount).toBeNull();
  expect(reads).toBeGreaterThan(10_000);
  expect(reads).toBeLessThan(10_500);
  const page = reportPage(data);
  expect(page).toContain('The newest 5,000 messages');
  expect(Buffer.byteLength(page)).toBeLessThan(300_000);
  expect(JSON.stringify(data).length).toBeLessThan(300_000);
}, 240_000);
