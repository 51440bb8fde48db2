import { createHmac } from 'node:crypto';
import { readdirSync, readFileSync } from 'node:fs';
import { beforeAll, describe, expect, it } from 'vitest';
import { createBackfillHandler } from '../../src/handlers/backfill.ts';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import { createReportHandler } from '../../src/handlers/report.ts';
import { createRouteHandler } from '../../src/handlers/route.ts';
import { createSettleHandler, type SettleUrlResult } from '../../src/handlers/settle.ts';
import { placeOrder } from '../../src/ledger/orders.ts';
import { linkTo } from '../../src/settle/link.ts';
import { createS3Store } from '../../src/store/s3.ts';
import { exampleDesk } from '../features/example.ts';
import { openStation, type Station, teach } from '../handlers/station.ts';
import { queues as intakeQueues, settings as intakeSettings } from '../intake/desk.ts';
import { actionsOfCommand, createRecordingClient, type Use } from './recording-s3.ts';
import { resources, statementsOf } from './template.ts';

const functions = ['Route', 'Confirm', 'Compact', 'Report', 'Settle', 'Intake', 'Backfill'] as const;
type Role = (typeof functions)[number];

const uses: Record<Role, Map<string, Use>> = {
  Route: new Map(),
  Confirm: new Map(),
  Compact: new Map(),
  Report: new Map(),
  Settle: new Map(),
  Intake: new Map(),
  Backfill: new Map(),
};
let playing: Role | null = null;

async function as<T>(role: Role, work: () => Promise<T>): Promise<T> {
  playing = role;
  try {
    return await work();
  } finally {
    playing = null;
  }
}

/** Which creations lose their answer; each at most once. */
let losing = '';
const isAnswerLost = (key: string): boolean => {
  const isLost = losing !== '' && key.startsWith(losing);
  if (isLost) losing = '';
  return isLost;
};

const note = (use: Use): void => {
  if (playing !== null) uses[playing].set(`${use.action} ${use.on}`, use);
};

/** A station whose handlers, and only they, are recorded. */
async function openRecorded(desk: unknown): Promise<Station> {
  const createStore = (nowMs: () => number) =>
    createS3Store({ client: createRecordingClient(note, nowMs, isAnswerLost), bucket: 'b', prefix: '' });
  const station = await openStation(createStore, desk);
  const { route, confirm, compact } = station;
  return Object.assign(station, {
    route: (event: unknown) => as('Route', () => route(event)),
    confirm: (event: unknown) => as('Confirm', () => confirm(event)),
    compact: (event: unknown) => as('Compact', () => compact(event)),
  });
}

/** A link, a list, messages settled and taken back, marks of messages that do not wait any more, and the schedule. */
async function playSettling(bare: Station, station: Station): Promise<void> {
  const secret = Buffer.from('a secret of more than 32 characters');
  const requestContext = { domainName: 'page.example', http: { method: 'GET' } };
  const undescribed = createSettleHandler(bare.deps, secret);
  const route = createRouteHandler({ ...station.deps, isMarkingWaiting: true });
  for (const name of ['mail/w1', 'mail/w2', 'mail/w3', 'mail/w4'])
    await as('Route', async () => station.feed(route, await station.putMail(name, 'Zebra', `zebra ${name}`)));
  await station.store.put('waiting/mail/gone', new Uint8Array(1));
  await station.confirmAs('mail/w4', 'billing');
  const handle = createSettleHandler(station.deps, secret);
  let cookie = '';
  const ask = async (method: string, path: string, form?: Record<string, string>) => {
    const [rawPath, rawQueryString = ''] = path.split('?');
    const event = {
      rawPath,
      rawQueryString,
      headers: { origin: 'https://page.example' },
      cookies: [cookie],
      ...(form === undefined ? {} : { body: new URLSearchParams(form).toString() }),
      requestContext: { domainName: 'page.example', http: { method } },
    };
    return as('Settle', async () => (await handle(event)) as SettleUrlResult);
  };
  const link = new URL(
    linkTo(secret, {
      url: new URL('https://page.example/'),
      by: 'jo',
      untilMs: station.world.nowMs() + 1000,
      number: 'n1',
    }),
  );
  const ticket = link.searchParams.get('t') as string;
  // Cold functions of a desk that learned nothing, and of one without a file.
  const blank = createSettleHandler((await openRecorded(exampleDesk)).deps, secret);
  await as('Settle', () => blank({ rawPath: '/enter', rawQueryString: `t=${ticket}`, requestContext }));
  await as('Settle', () =>
    undescribed({ rawPath: '/enter', rawQueryString: `t=${ticket}`, requestContext }),
  ).catch(() => {});
  expect((await ask('GET', `/enter?t=${ticket}`)).statusCode).toBe(200);
  cookie = (await ask('POST', '/enter', { ticket })).cookies[0]!.split(';')[0] as string;
  const tokenOf = async (message: string, action: string) => {
    const { body } = await ask('GET', `/message?m=${encodeURIComponent(message)}`);
    return /name="token" value="([^"]*)"/.exec(body.slice(body.indexOf(`action="${action}"`)))?.[1] ?? '';
  };
  const settle = async (message: string) =>
    ask('POST', '/settle', { message, queue: 'billing', token: await tokenOf(message, '/settle') });
  expect((await ask('GET', '/')).body).toContain('3 messages wait');
  expect((await settle('mail/w1')).statusCode).toBe(303);
  const undone = { message: 'mail/w1', token: await tokenOf('mail/w2', '/undo') };
  expect((await ask('POST', '/undo', undone)).statusCode).toBe(303);
  expect((await settle('mail/w1')).statusCode).toBe(303);
  expect((await settle('mail/w2')).statusCode).toBe(303);
  await as('Settle', () => handle({}));
  station.pass(24 * 3_600_000);
  await as('Settle', () => handle({}));
}

/** Plays everything that each function does, also when things are missing. */
beforeAll(async () => {
  const bare = await openRecorded(null);
  const lost = await bare.putMail('mail/1', 'Hello', 'Is anyone there?');
  await bare.feed(bare.route, lost);
  await bare.confirmAs('mail/1', 'billing');
  await bare.compact({}).catch(() => {});

  const station = await openRecorded(exampleDesk);
  const first = await station.putMail('mail/first', 'My bill', 'The bill is too high');
  await station.feed(station.route, first, 'inbound/mail/gone');
  await station.compact({});
  await teach(station);
  await station.feed(station.route, first);
  const second = await station.putMail('mail/second', 'My bill', 'The bill is wrong');
  await station.feed(station.route, second);

  // Confirmations: of a message that is not there, of an unknown queue, repeated, corrected.
  await station.confirmAs('mail/none', 'billing');
  await station.confirmAs('mail/second', 'no-such-queue');
  await station.feed(station.confirm, 'confirmations/gone.json');
  await station.confirmAs('mail/second', 'leaks');
  await station.compact({});
  losing = 'model/segments/';
  await station.confirmAs('mail/second', 'moving');
  expect(losing).toBe('');
  // Whether its segment landed is asked of what the compaction absorbed.
  await station.confirmAs('mail/second', 'billing');
  const third = await station.putMail('mail/third', 'My bill', 'Another bill');
  await station.feed(station.route, third);

  // The night: drops left lying, orders of commands that died, objects behind the horizon, a recount.
  const at = new Date(station.world.nowMs()).toISOString();
  await station.putDrop('left', { message: 'mail/third', queue: 'billing', by: 'a.tolland', at });
  await station.putDrop('left-wrong', { message: 'mail/third', queue: 'no-such-queue', by: 'a.tolland', at });
  await station.putDrop('left-unknown', { message: 'mail/none', queue: 'billing', by: 'a.tolland', at });
  station.pass(2 * 3_600_000);
  await station.compact({ recount: true });
  await placeOrder(station.world, {
    kind: 'erase',
    messages: ['mail/second', 'mail/third'],
    atMs: station.world.nowMs(),
  });
  await placeOrder(station.world, {
    kind: 'undo',
    by: 'a.tolland',
    sinceMs: 0,
    untilMs: station.world.nowMs(),
    atMs: station.world.nowMs(),
  });
  await placeOrder(station.world, { kind: 'sweep', atMs: station.world.nowMs() });
  await station.putDrop('young', { message: 'mail/second', queue: 'billing', by: 'a.tolland', at });
  station.pass(600_000);
  await station.compact({});
  station.pass(40 * 24 * 3_600_000);
  await teach(station);
  await station.compact({});

  // The report: of a desk without a file, of one that learned nothing, of one with a base and a segment beside it.
  const report = (of: Station) => as('Report', () => createReportHandler(of.deps)({}));
  await report(bare).catch(() => {});
  await report(await openRecorded(exampleDesk));
  await station.confirmAs('lesson-0', 'moving');
  await report(station);

  await playSettling(bare, station);

  const secret = Buffer.from('a secret of twenty-four.').toString('base64');
  const intake = createIntakeHandler({
    world: { ...station.world, nowMs: Date.now },
    log: () => {},
    loadDesk: async () => {
      await station.store.get('config/desk.json');
      return { settings: intakeSettings, queues: intakeQueues, webhookSecrets: [secret] };
    },
  });
  const post = (rawPath: string, body: string, headers: Record<string, string>) =>
    as('Intake', () =>
      intake({
        rawPath,
        body,
        headers: { 'content-type': 'application/json', ...headers },
        requestContext: { requestId: 'r1', http: { method: 'POST' } },
      }),
    );
  const form = await post(
    '/forms/contact',
    JSON.stringify({ topic: 'bill', email: 'pat@home.example', message: 'Too high.' }),
    {},
  );
  expect(form.statusCode).toBe(202);
  const webhook = JSON.stringify({
    case: { externalId: 'forms/contact/x.json', team: { name: 'Billing Team' } },
    actor: { login: 'jo' },
    occurredAt: new Date().toISOString(),
  });
  const seconds = String(Math.floor(Date.now() / 1000));
  const signature = createHmac('sha256', Buffer.from(secret, 'base64'))
    .update(`id1.${seconds}.${webhook}`)
    .digest('base64');
  const signed = {
    'webhook-id': 'id1',
    'webhook-timestamp': seconds,
    'webhook-signature': `v1,${signature}`,
  };
  expect((await post('/confirmations', webhook, signed)).statusCode).toBe(202);
  expect((await post('/confirmations', webhook, signed)).statusCode).toBe(200);
  await as('Intake', async () => (await openRecorded(null)).deps.loadDesk()).catch(() => {});

  const backfill = createBackfillHandler(station.deps);
  await station.putMail('archive/billing/old', 'My bill', 'The bill of two years ago');
  const tasks = ['inbound/archive/billing/old', 'inbound/archive/billing/gone'].map((s3Key, i) => ({
    taskId: `t${i}`,
    s3Key,
  }));
  const fresh = await openRecorded(null);
  await as('Backfill', () =>
    createBackfillHandler({ ...fresh.deps })({
      invocationSchemaVersion: '1.0',
      invocationId: 'i',
      job: { id: 'j' },
      tasks,
    }),
  ).catch(() => {});
  station.pass(120_000); // The desk's file is looked at again.
  const learned = await as('Backfill', () =>
    backfill({ invocationSchemaVersion: '1.0', invocationId: 'i', job: { id: 'j' }, tasks }),
  );
  expect(learned.results.map(({ resultCode }) => resultCode)).toEqual(['Succeeded', 'PermanentFailure']);
}, 300_000);

const matches = (pattern: string, key: string): boolean =>
  pattern.endsWith('*') ? key.startsWith(pattern.slice(0, -1)) : pattern === key;

/** Each action with one pattern of keys that a role allows it on. */
function allowedTo(role: Role): Use[] {
  return statementsOf(`${role}Role`).flatMap(({ actions, resources: on, condition }) =>
    actions
      .filter((action) => action.startsWith('s3:'))
      .flatMap((action) =>
        action === 's3:ListBucket'
          ? condition.StringLikeIfExists['s3:prefix'].map((pattern: string) => ({ action, on: pattern }))
          : on.map((resource) => ({ action, on: resource.replace(/^\$\{Bucket\.Arn\}\//, '') })),
      ),
  );
}

describe('the store adapter', () => {
  it('makes the requests whose actions are known here, and no other', () => {
    const source = readFileSync(new URL('../../src/store/s3.ts', import.meta.url), 'utf8');
    const commands = new Set([...source.matchAll(/new (\w+Command)\(/g)].map(([, name]) => name));
    expect([...commands].sort()).toEqual(Object.keys(actionsOfCommand).sort());
  });

  it('is the only place that makes requests to AWS', () => {
    const source = new URL('../../src/', import.meta.url);
    const importers = readdirSync(source, { recursive: true, encoding: 'utf8' })
      .filter((name) => name.endsWith('.ts'))
      .flatMap((name) =>
        [
          ...readFileSync(new URL(name, source), 'utf8').matchAll(
            /import (?:type )?\{([^}]*)\} from '@(?:aws-sdk|smithy)\//g,
          ),
        ].map(([, names]) => `${name}: ${names!.replace(/\s+/g, ' ').trim()}`),
      )
      .filter((line) => !line.startsWith('store/s3.ts:'));
    expect(importers.sort()).toEqual(['handlers/lambda/environment.ts: S3Client']);
  });

  it('needs together what the roles of the functions allow together', () => {
    const allowed = new Set(functions.flatMap((role) => allowedTo(role).map(({ action }) => action)));
    expect([...allowed].sort()).toEqual([...new Set(Object.values(actionsOfCommand).flat())].sort());
  });
});

describe.each(functions)('the role of %s', (role) => {
  it('allows every request that the function makes', () => {
    const allowed = allowedTo(role);
    const refused = [...uses[role].values()].filter(
      (use) => !allowed.some(({ action, on }) => action === use.action && matches(on, use.on)),
    );
    expect(refused).toEqual([]);
  });

  it('allows nothing that the function does not do', () => {
    const unused = allowedTo(role).filter(
      ({ action, on }) =>
        ![...uses[role].values()].some((use) => use.action === action && matches(on, use.on)),
    );
    expect(unused).toEqual([]);
  });

  it('names no action by a wildcard and no resource outside of the stack', () => {
    for (const { actions, resources: on } of statementsOf(`${role}Role`)) {
      for (const action of actions) expect(action).toMatch(/^(s3|sqs|logs):[A-Za-z]+$/);
      for (const resource of on)
        expect(resource).toMatch(/^(\$\{Bucket\.Arn\}\/[a-z]|Bucket\.Arn$|[A-Z]\w+\.Arn$)/);
    }
  });

  it('brings no managed policy, and the function no policy of the transform', () => {
    expect(resources[`${role}Role`].Properties.ManagedPolicyArns).toBeUndefined();
    expect(resources[`${role}Function`].Properties.Policies).toBeUndefined();
    expect(resources[`${role}Function`].Properties.Role).toEqual({ 'Fn::GetAtt': [`${role}Role`, 'Arn'] });
  });
});
