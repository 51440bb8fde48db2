import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { createMemoryStore } from '../../src/store/memory.ts';
import { createS3Store } from '../../src/store/s3.ts';
import type { Store } from '../../src/store/store.ts';
import { startLoopbackS3 } from '../lambda/loopback-s3.ts';
import { startResigningProxy } from '../race/resigning-proxy.ts';
import { createShimmedClient, endpoint, makeBucket } from '../race/s3-shim.ts';
import { mail, runCli } from './run-cli.ts';

/** Every command that works on a store, on a bucket: a real server where there is one, Amazon's protocol on loopback elsewhere. */
describe('commands on a bucket', () => {
  const before = { ...process.env };
  let store: Store;
  let place = '';
  let close: () => Promise<void> = async () => {};

  beforeAll(async () => {
    let at: { readonly endpoint: string; close(): Promise<void> };
    if (endpoint === undefined) {
      process.stdout.write(
        'left out: commands on a real S3-protocol server (TALLYPOST_S3_ENDPOINT is not set)\n',
      );
      const memory = createMemoryStore();
      at = await startLoopbackS3(memory, 'fenmark-mail');
      place = 's3://fenmark-mail/desk';
      store = belowDesk(memory);
    } else {
      const client = createShimmedClient(endpoint);
      const bucket = await makeBucket(client);
      at = await startResigningProxy(endpoint);
      place = `s3://${bucket}/desk`;
      store = createS3Store({ client, bucket, prefix: 'desk' });
    }
    close = at.close;
    Object.assign(process.env, {
      AWS_ENDPOINT_URL_S3: at.endpoint,
      AWS_REGION: 'eu-west-2',
      AWS_ACCESS_KEY_ID: 'testkey',
      AWS_SECRET_ACCESS_KEY: 'testsecret',
    });
  }, 60_000);
  afterAll(async () => {
    for (const name of Object.keys(process.env)) if (!(name in before)) delete process.env[name];
    Object.assign(process.env, before);
    await close();
  });

  const run = async (...args: string[]) => {
    const ran = await runCli(...args, '--store', place, '--json');
    expect([args.join(' '), ran.code, ran.code === 0 ? '' : ran.out]).toEqual([args.join(' '), 0, '']);
    return ran.json();
  };
  /** After what lies dropped was folded, which on a bucket is left to its functions. */
  const recounted = async () => {
    await run('run');
    const { messages, differences } = await run('recount');
    return [messages, differences.length ?? differences];
  };

  it('open, route, confirm, explain, compact, report, correct, undo, erase, rename, restore and recount', async () => {
    await run('init');
    const lessons: readonly (readonly [string, string])[] = [
      ['billing', 'My bill is too high and I paid it twice'],
      ['billing', 'Please refund the second payment of my bill'],
      ['complaints', 'Nobody called me back, this is the third complaint'],
      ['complaints', 'I complain about your engineer who never came'],
    ];
    for (const [i, [, text]] of lessons.entries())
      await store.put(`inbound/mail/${i}`, Buffer.from(mail('Hello', text)), {
        contentType: 'message/rfc822',
      });
    expect((await run('run')).held).toBe(4);
    const queues: string[] = JSON.parse(
      Buffer.from(
        ((await store.get('config/desk.json')) as { object: { body: Uint8Array } }).object.body,
      ).toString(),
    ).queues.map(({ id }: { id: string }) => id);
    const [one, two] = queues as [string, string];
    for (const [i, [queue]] of lessons.entries())
      await run('confirm', `mail/${i}`, queue === 'billing' ? one : two, '--by', i === 3 ? 'wrong' : 'jo');
    await run('compact');
    expect(await recounted()).toEqual([4, 0]);
    expect((await run('explain', 'mail/0')).queues?.length ?? 1).toBeGreaterThan(0);
    const report = await run('report');
    expect(await store.head(report.page)).toMatchObject({ bytes: report.pageBytes });
    await run('confirm', 'mail/2', one, '--by', 'jo');
    expect(await recounted()).toEqual([4, 0]);
    await run('undo', '--by', 'wrong', '--since', '2020-01-01T00:00:00Z', '--until', '2100-01-01T00:00:00Z');
    expect(await recounted()).toEqual([3, 0]);
    await run('erase', 'mail/1');
    expect(await store.head('inbound/mail/1')).toBeNull();
    expect(await recounted()).toEqual([2, 0]);
    await run('queue', 'open', 'fresh-queue', '--title', 'Fresh');
    await run('queue', 'rename', 'fresh-queue', 'newer-queue');
    await run('compact');
    expect(await recounted()).toEqual([2, 0]);
  }, 300_000);
});

/** The store below `desk/` of another. */
function belowDesk(all: Store): Store {
  const below = (key: string) => `desk/${key}`;
  return {
    ...all,
    get: (key, options) => all.get(below(key), options),
    head: (key) => all.head(below(key)),
    put: (key, body, options) => all.put(below(key), body, options),
  };
}
