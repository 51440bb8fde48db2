import { execFileSync } from 'node:child_process';
import { mkdtempSync, readdirSync, readFileSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { linkTo } from '../../src/settle/link.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { createS3Store } from '../../src/store/s3.ts';
import type { Store } from '../../src/store/store.ts';
import { startResigningProxy } from '../race/resigning-proxy.ts';
import { createShimmedClient, endpoint, makeBucket } from '../race/s3-shim.ts';
import { startLoopbackS3 } from './loopback-s3.ts';
import { lambdaNode, type StartedFunction, startFunction } from './runtime.ts';

const project = fileURLToPath(new URL('../../', import.meta.url));
const events = join(project, 'events');
const eventIn = (name: string): unknown =>
  JSON.parse(readFileSync(join(events, name), 'utf8').replaceAll('fenmark-mail', bucket));
const messageIn = (name: string): Uint8Array => readFileSync(join(events, 'messages', name));

const root = mkdtempSync(join(tmpdir(), 'tallypost-bundles-'));
const bundleOf = (name: string): string => join(root, 'functions', name, 'index.mjs');
/** Amazon's protocol on loopback over memory, or a real server where there is one. */
let bucket = 'fenmark-mail';
let store: Store;
let s3: { readonly endpoint: string; close(): Promise<void> };
const started: StartedFunction[] = [];

beforeAll(async () => {
  execFileSync(process.execPath, [join(project, '.config/bundle.mjs'), '--functions', `--into=${root}`], {
    stdio: 'ignore',
  });
  if (endpoint === undefined) {
    process.stdout.write(
      'left out: bundles on a real S3-protocol server (TALLYPOST_S3_ENDPOINT is not set)\n',
    );
    store = createMemoryStore();
    s3 = await startLoopbackS3(store, bucket);
  } else {
    const client = createShimmedClient(endpoint);
    bucket = await makeBucket(client);
    store = createS3Store({ client, bucket, prefix: '' });
    s3 = await startResigningProxy(endpoint);
  }
  await store.put('config/desk.json', readFileSync(join(events, 'desk.json')));
  if (lambdaNode === process.execPath)
    process.stdout.write(
      `bundles run on this Node ${process.version}; TALLYPOST_LAMBDA_NODE names another\n`,
    );
}, 120_000);
afterAll(async () => {
  await Promise.all(started.map((one) => one.stop()));
  await s3.close();
  rmSync(root, { recursive: true, force: true });
}, 60_000);

async function start(name: string, more: Record<string, string> = {}): Promise<StartedFunction> {
  const one = await startFunction(bundleOf(name), {
    AWS_ENDPOINT_URL_S3: s3.endpoint,
    TALLYPOST_BUCKET: bucket,
    TALLYPOST_TOKEN_KEY: '000102030405060708090a0b0c0d0e0f',
    ...more,
  });
  started.push(one);
  return one;
}

async function keysOf(prefix: string): Promise<string[]> {
  const keys: string[] = [];
  for await (const { key } of store.list(prefix)) keys.push(key);
  return keys;
}
const metadataOf = async (key: string): Promise<Readonly<Record<string, string>>> =>
  (await store.head(key))?.metadata ?? {};
const lines = (one: StartedFunction): Record<string, unknown>[] =>
  one
    .output()
    .split('\n')
    .filter(Boolean)
    .map((line) => JSON.parse(line));

describe('a bundle', () => {
  it.each([
    ['route', 1_800_000],
    ['confirm', 1_800_000],
    ['compact', 1_800_000],
    ['report', 1_800_000],
    ['settle', 1_800_000],
    ['backfill', 1_800_000],
    // Parses no mail.
    ['intake', 600_000],
  ])('of %s is one file of at most %i bytes', (name, bytesMax) => {
    expect(readdirSync(join(root, 'functions', name))).toEqual(['index.mjs']);
    expect(statSync(bundleOf(name)).size).toBeLessThanOrEqual(bytesMax);
  });

  it('of every folder that the template names is built, and no other', () => {
    const template = readFileSync(join(project, 'template.yaml'), 'utf8');
    const named = [...template.matchAll(/CodeUri: dist\/functions\/(\w+)/g)].map(([, name]) => name);
    expect(named.sort()).toEqual(readdirSync(join(root, 'functions')).sort());
  });

  it('that misses a setting says so before its first event', async () => {
    await expect(startFunction(bundleOf('route'), { AWS_ENDPOINT_URL_S3: s3.endpoint })).rejects.toThrow(
      'setting-missing at TALLYPOST_BUCKET',
    );
  });
});

/** In order: what one function leaves, the next one finds. */
describe('the example events, played through the built bundles', () => {
  it('route: a message of a direct S3 event is held while nothing is learned', async () => {
    const key = 'inbound/mail/20260105T091316-cc353315';
    await store.put(key, messageIn('plain.eml'), { contentType: 'message/rfc822' });
    const route = await start('route');
    expect(await route.invoke(eventIn('route-s3.json'))).toEqual({
      kind: 'response',
      value: { batchItemFailures: [] },
    });
    expect(await metadataOf(key)).toMatchObject({
      'tallypost-decision': 'held',
      'tallypost-reason': 'nothing-learned',
    });
    expect((await store.head(key))?.contentType).toBe('message/rfc822');
  });

  it('route: an SQS batch of messages, one of which a guard sends on its way', async () => {
    await store.put('inbound/mail/20260105T125640-53de95e3', messageIn('guarded-electrics.eml'));
    await store.put('inbound/mail/20260105T051909-5e2b9f0f', messageIn('alternative-with-attachment.eml'));
    const [route] = started as [StartedFunction];
    expect(await route.invoke(eventIn('route-sqs.json'))).toEqual({
      kind: 'response',
      value: { batchItemFailures: [] },
    });
    expect(await metadataOf('inbound/mail/20260105T125640-53de95e3')).toMatchObject({
      'tallypost-decision': 'guarded',
      'tallypost-queue': 'leaks-and-bursts',
      'tallypost-reason': 'electricity-and-gas',
    });
    expect(await metadataOf('inbound/mail/20260105T051909-5e2b9f0f')).toMatchObject({
      'tallypost-decision': 'held',
    });
    expect(lines(route).map(({ event }) => event)).toEqual(expect.arrayContaining(['held', 'guarded']));
    const metrics = lines(route).filter((line) => '_aws' in line);
    expect(metrics.length).toBeGreaterThan(0);
    expect(metrics[0]).toMatchObject({ Desk: bucket });
  });

  it('route: the test message of a new notification is acknowledged', async () => {
    const [route] = started as [StartedFunction];
    const answer = await route.invoke(eventIn('s3-test-sqs.json'));
    expect(answer).toEqual({ kind: 'response', value: { batchItemFailures: [] } });
  });

  it('confirm: a confirmation is folded and its drop deleted; one of an unknown message is set aside', async () => {
    const confirmation = eventIn('confirmation.json') as { message: string };
    await store.put(`inbound/${confirmation.message}`, messageIn('html.eml'));
    await store.put('confirmations/drop 1.json', Buffer.from(JSON.stringify(confirmation)));
    await store.put(
      'confirmations/drop 2.json',
      Buffer.from(JSON.stringify({ ...confirmation, message: 'mail/none' })),
    );
    const confirm = await start('confirm');
    expect(await confirm.invoke(eventIn('confirm-sqs.json'))).toEqual({
      kind: 'response',
      value: { batchItemFailures: [] },
    });
    expect(await keysOf('confirmations')).toEqual(['confirmations-refused/drop 2.json']);
    expect(await keysOf('histories/')).toEqual([`histories/${confirmation.message}.json`]);
    expect(await keysOf('model/segments/')).toHaveLength(1);
  });

  it('compact: the schedule makes a table of what was folded', async () => {
    const compact = await start('compact');
    const answer = await compact.invoke(eventIn('compact-schedule.json'));
    expect(answer).toMatchObject({
      kind: 'response',
      value: { compaction: { kind: 'compacted', messages: 1, segments: 1 } },
    });
    expect(await keysOf('model/tables/')).toHaveLength(1);
    const counted = await compact.invoke({ recount: true });
    expect(counted).toMatchObject({
      kind: 'response',
      value: { recount: { messages: 1, differences: 0, fault: null } },
    });
  });

  it('report: a page is written that no request leaves, and its numbers beside it', async () => {
    const report = await start('report');
    const answer = await report.invoke(eventIn('compact-schedule.json'));
    const { page, numbers, pageBytes } = answer.value as { page: string; numbers: string; pageBytes: number };
    expect(answer.kind).toBe('response');
    expect(await keysOf('reports/')).toEqual([page, numbers, 'reports/latest.html', 'reports/latest.json']);
    expect(await store.head('reports/latest.html')).toMatchObject({
      bytes: pageBytes,
      contentType: 'text/html; charset=utf-8',
    });
    const latest = await store.get('reports/latest.html');
    const html = latest.kind === 'found' ? Buffer.from(latest.object.body).toString() : '';
    expect(html).toContain('default-src &#39;none&#39;');
    expect(html).toContain('counted again from 1 confirmation');
    expect(lines(report).find((line) => 'Reports' in line)).toMatchObject({ Desk: bucket, Reports: 1 });
  });

  it('route: the next message is decided by that table', async () => {
    await store.put('inbound/mail/20260105T091316-cc353315', messageIn('plain.eml'));
    const [route] = started as [StartedFunction];
    await route.invoke(eventIn('route-s3.json'));
    const { 'tallypost-model': version } = await metadataOf('inbound/mail/20260105T091316-cc353315');
    expect(Number(version)).toBeGreaterThanOrEqual(2); // One fold, one compaction.
  });

  it('intake: a form is stored, a signature of long ago is not taken', async () => {
    const intake = await start('intake', {
      TALLYPOST_WEBHOOK_SECRETS: 'whsec_ZmVubWFyay13ZWJob29rLXNlY3JldC0x',
    });
    expect(await intake.invoke(eventIn('intake-form.json'))).toMatchObject({
      kind: 'response',
      value: { statusCode: 202 },
    });
    expect(await intake.invoke(eventIn('intake-form-encoded.json'))).toMatchObject({
      kind: 'response',
      value: { statusCode: 303 },
    });
    expect(await intake.invoke(eventIn('intake-confirmation.json'))).toMatchObject({
      kind: 'response',
      value: { statusCode: 401 },
    });
    expect(await keysOf('inbound/forms/')).toHaveLength(2);
    expect(await keysOf('confirmations/')).toEqual([]);
  });

  it('settle: a link lets a person in, who settles what the router marked; the schedule drops it', async () => {
    const secret = 'a secret of more than thirty-two characters';
    const domainName = 'abc.lambda-url.eu-west-2.on.aws';
    const marking = await start('route', { TALLYPOST_MARK_WAITING: 'yes' });
    await store.put('inbound/mail/new', messageIn('forwarded.eml'));
    const event = JSON.stringify(eventIn('route-s3.json')).replaceAll('20260105T091316-cc353315', 'new');
    await marking.invoke(JSON.parse(event));
    const [marked] = await keysOf('waiting/');
    expect(marked).toBe('waiting/mail/new');
    const settle = await start('settle', { TALLYPOST_SETTLE_SECRET: secret });
    let cookie: string[] = [];
    const ask = async (method: string, path: string, form: Record<string, string> | null = null) => {
      const [rawPath, rawQueryString] = path.split('?');
      const answer = await settle.invoke({
        version: '2.0',
        rawPath,
        rawQueryString,
        headers: { origin: `https://${domainName}` },
        cookies: cookie,
        body: form && new URLSearchParams(form).toString(),
        requestContext: { domainName, http: { method } },
      });
      return answer.value as { statusCode: number; cookies: string[]; body: string };
    };
    const link = linkTo(Buffer.from(secret), {
      url: new URL(`https://${domainName}/`),
      by: 'jo',
      untilMs: Date.now() + 60_000,
      number: 'n1',
    });
    const ticket = new URL(link).searchParams.get('t') as string;
    expect((await ask('GET', `/enter?t=${ticket}`)).statusCode).toBe(200);
    cookie = [(await ask('POST', '/enter', { ticket })).cookies[0]!.split(';')[0] as string];
    const message = marked!.slice('waiting/'.length);
    const view = await ask('GET', `/message?m=${encodeURIComponent(message)}`);
    const token = /name="token" value="([^"]*)"/.exec(view.body)?.[1] as string;
    expect((await ask('POST', '/settle', { message, queue: 'billing', token })).statusCode).toBe(303);
    expect((await ask('POST', '/settle', { message, queue: 'billing', token })).statusCode).toBe(409);
    // It can be taken back for ten minutes.
    expect(await settle.invoke({})).toEqual({ kind: 'response', value: { dropped: 0 } });
    expect((await keysOf('settling/')).map((key) => key.split('/')[1])).toEqual(['last', 'used', 'used']);
  });

  it('backfill: a task of a batch job leaves a confirmation to be folded', async () => {
    await store.put('inbound/archive/billing/2025/final bill.eml', messageIn('plain.eml'));
    const backfill = await start('backfill');
    const answer = await backfill.invoke(eventIn('backfill.json'));
    expect(answer).toMatchObject({
      kind: 'response',
      value: { results: [{ resultCode: 'Succeeded', resultString: 'billing' }] },
    });
    expect(await keysOf('confirmations/')).toHaveLength(1);
  });

  it('a failure of the whole invocation is reported as one, and the function goes on', async () => {
    const compact = await start('compact', { TALLYPOST_BUCKET: 'another-bucket' });
    const answer = await compact.invoke(eventIn('compact-schedule.json'));
    expect(answer).toMatchObject({ kind: 'error', value: { errorType: 'TallypostError' } });
    expect((answer.value as { errorMessage: string }).errorMessage).toContain(
      's3://another-bucket/config/desk.json',
    );
    expect((await compact.invoke({})).kind).toBe('error');
  });

  it('no function wrote anything but lines of JSON', () => {
    for (const one of started) expect(() => lines(one)).not.toThrow();
  });
});
