import { randomBytes } from 'node:crypto';
import type { BatchHandler } from '../../src/handlers/batch-handler.ts';
import { createCompactHandler } from '../../src/handlers/compact.ts';
import { createConfirmHandler } from '../../src/handlers/confirm.ts';
import type { HandlerDeps, LogLine } from '../../src/handlers/handler-deps.ts';
import { createDeskLoader } from '../../src/handlers/load-desk.ts';
import { queueEvent } from '../../src/handlers/local-runner.ts';
import { createRouteHandler } from '../../src/handlers/route.ts';
import type { World } from '../../src/ledger/world.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { exampleDesk, exampleKey } from '../features/example.ts';

/** A desk's store, clock, handlers and log, for tests. */
export interface Station {
  readonly store: Store;
  readonly world: World;
  readonly deps: HandlerDeps;
  readonly log: LogLine[];
  readonly route: BatchHandler;
  readonly confirm: BatchHandler;
  readonly compact: ReturnType<typeof createCompactHandler>;
  /** Moves the clock. */
  pass(ms: number): void;
  putDesk(desk: unknown): Promise<void>;
  putMail(name: string, subject: string, text: string, headers?: string): Promise<string>;
  putForm(name: string, form: unknown): Promise<string>;
  putDrop(name: string, drop: unknown): Promise<string>;
  /** Puts a drop for the message and folds it; gives the handler's answer. */
  confirmAs(message: string, queue: string, by?: string): ReturnType<BatchHandler>;
  /** Feeds keys to a handler as one SQS batch, the receipt of each being its key. */
  feed(handler: BatchHandler, ...objectKeys: string[]): ReturnType<BatchHandler>;
  metadata(key: string): Promise<Record<string, string>>;
  keys(prefix: string): Promise<string[]>;
  json(key: string): Promise<unknown>;
}

export const startMs = Date.UTC(2026, 2, 2, 9, 0);

export async function openStation(
  createStore: (nowMs: () => number) => Store = createMemoryStore,
  desk: unknown = exampleDesk,
): Promise<Station> {
  let clockMs = startMs;
  let drawn = 0;
  const store = createStore(() => clockMs);
  const world: World = {
    store,
    nowMs: () => clockMs,
    // Distinct and repeatable: ids need no more.
    random: () => {
      drawn += 1;
      return (drawn * 0.6180339887498949) % 1;
    },
    sleep: async (ms) => {
      clockMs += ms;
    },
  };
  const log: LogLine[] = [];
  const deps: HandlerDeps = {
    world,
    loadDesk: createDeskLoader(world),
    tokenKey: exampleKey,
    log: (line) => log.push(line),
  };
  const bytes = (text: string) => new TextEncoder().encode(text);
  const station: Station = {
    store,
    world,
    deps,
    log,
    route: createRouteHandler(deps),
    confirm: createConfirmHandler(deps),
    compact: createCompactHandler(deps),
    pass: (ms) => {
      clockMs += ms;
    },
    async putDesk(file) {
      await store.put('config/desk.json', bytes(typeof file === 'string' ? file : JSON.stringify(file)));
    },
    async putMail(name, subject, text, headers = '') {
      const key = `inbound/${name}`;
      await store.put(key, bytes(mailText(subject, text, headers)), { contentType: 'message/rfc822' });
      return key;
    },
    async putForm(name, form) {
      const key = `inbound/${name}.json`;
      await store.put(key, bytes(typeof form === 'string' ? form : JSON.stringify(form)));
      return key;
    },
    async putDrop(name, drop) {
      const key = `confirmations/${name}.json`;
      await store.put(key, bytes(typeof drop === 'string' ? drop : JSON.stringify(drop)));
      return key;
    },
    async confirmAs(message, queue, by = 'a.tolland') {
      clockMs += 1000;
      const at = new Date(clockMs).toISOString();
      const key = await station.putDrop(randomBytes(6).toString('hex'), { message, queue, by, at });
      return station.feed(station.confirm, key);
    },
    feed(handler, ...objectKeys) {
      const event = queueEvent(objectKeys, '', clockMs, world.random);
      const records = event.Records as { messageId: string }[];
      records.forEach((record, i) => {
        record.messageId = objectKeys[i]!;
      });
      return handler(event);
    },
    async metadata(key) {
      const head = await store.head(key);
      return { ...(head?.metadata ?? {}) };
    },
    async keys(prefix) {
      const found: string[] = [];
      for await (const { key } of store.list(prefix)) found.push(key);
      return found;
    },
    async json(key) {
      const got = await store.get(key);
      return got.kind === 'found' ? JSON.parse(new TextDecoder().decode(got.object.body)) : null;
    },
  };
  if (desk !== null) await station.putDesk(desk);
  return station;
}

function mailText(subject: string, text: string, headers: string): string {
  return [
    'From: Ana Reed <ana@home.test>',
    'To: help@fenmarkwater.example',
    `Subject: ${subject}`,
    'Date: Mon, 2 Mar 2026 09:00:00 +0000',
    'Message-ID: <1@home.test>',
    ...headers.split('\n').filter((line) => line !== ''),
    'Content-Type: text/plain; charset=utf-8',
    '',
    text,
    '',
  ].join('\r\n');
}

/** Three queues' worth of mail, told apart by words. */
export const lessons: readonly (readonly [queue: string, subject: string, text: string])[] = [
  ['billing', 'My bill', 'The bill you sent me is far too high, please check the amount charged.'],
  ['billing', 'Payment', 'I paid my bill twice by mistake, please refund the second payment.'],
  ['billing', 'Direct debit', 'Please change the day of my direct debit payment for the water bill.'],
  ['billing', 'Charge', 'Why was I charged a late fee on this bill although I paid in time?'],
  ['leaks', 'Leak', 'There is a leak in the road outside our house, water is running everywhere.'],
  ['leaks', 'Burst pipe', 'A pipe burst on the corner and water is pouring down the street.'],
  ['leaks', 'Water in the road', 'Water keeps leaking from a pipe under the pavement, the road is wet.'],
  ['leaks', 'Stop tap', 'The stop tap outside is leaking and the pipe below drips all day.'],
  ['moving', 'Moving house', 'We are moving home next month, please close our account at the old address.'],
  ['moving', 'New address', 'I have moved to a new address and want to open an account for the new home.'],
  [
    'moving',
    'Change of tenant',
    'A new tenant is moving in on Friday, please change the name on the account.',
  ],
  ['moving', 'We move', 'Our moving date is the first of May, here is our new home address.'],
];

/** Puts and confirms every lesson. */
export async function teach(station: Station): Promise<void> {
  for (const [i, [queue, subject, text]] of lessons.entries()) {
    await station.putMail(`lesson-${i}`, subject, text);
    const result = await station.confirmAs(`lesson-${i}`, queue);
    if (result.batchItemFailures.length > 0) throw new Error(`lesson ${i} was not folded`);
  }
}
