import { describe, expect, it } from 'vitest';
import { createMemoryStore } from '../../src/store/memory.ts';
import { createS3Store } from '../../src/store/s3.ts';
import type { Store } from '../../src/store/store.ts';
import { createShimmedClient, endpoint, makeBucket } from '../race/s3-shim.ts';
import { confirmation, formEvent, job, mail, open, secret, signedEvent } from './requests.ts';

/** What intake and backfill leave behind, on a store. */
function describeIntakeOn(name: string, make: () => Promise<Store>): void {
  describe(`intake and backfill on ${name}`, () => {
    const textOf = async (store: Store, key: string) => {
      const got = await store.get(key);
      return got.kind === 'found' ? Buffer.from(got.object.body).toString() : null;
    };
    const keysOf = async (store: Store, prefix: string) => {
      const found: string[] = [];
      for await (const { key } of store.list(prefix)) found.push(key);
      return found;
    };

    it('store a form with its type and its trace', async () => {
      const store = await make();
      const answer = await open(store).intake(
        formEvent('/forms/contact', { topic: 'bill', message: 'Größe 日本' }, 'r1'),
      );
      const key = `inbound/${JSON.parse(answer.body).message}`;
      expect(JSON.parse((await textOf(store, key))!).fields.message).toBe('Größe 日本');
      expect(await store.head(key)).toMatchObject({
        contentType: 'application/json',
        metadata: { 'tallypost-trace': 'r1' },
      });
    });

    it('drop a confirmation once, however many deliveries run at the same time and later', async () => {
      const store = await make();
      const { intake } = open(store);
      const event = signedEvent(secret, Date.now(), confirmation, 'r2');
      const answers = await Promise.all(Array.from({ length: 8 }, () => intake(event)));
      expect(answers.every(({ statusCode }) => statusCode === 202 || statusCode === 200)).toBe(true);
      const drops = await keysOf(store, 'confirmations/');
      expect(drops).toHaveLength(1);
      await store.delete(drops[0]!);
      expect((await intake(event)).statusCode).toBe(200);
      expect(await keysOf(store, 'confirmations/')).toEqual([]);
      expect(await keysOf(store, 'webhook-marks/')).toHaveLength(1);
    });

    it('learn an archived message, once for any number of jobs', async () => {
      const store = await make();
      await store.put('inbound/archive/billing/a b+c.eml', Buffer.from(mail));
      const { backfill } = open(store);
      for (let i = 0; i < 2; i++) {
        const { results } = await backfill(job('inbound/archive/billing/a+b%2Bc.eml'));
        expect(results[0]!.resultCode).toBe('Succeeded');
      }
      const drops = await keysOf(store, 'confirmations/');
      expect(drops).toHaveLength(1);
      expect(JSON.parse((await textOf(store, drops[0]!))!)).toMatchObject({
        message: 'archive/billing/a b+c.eml',
        at: '2025-03-03T09:00:00.000Z',
      });
      expect((await backfill(job('inbound/archive/billing/none.eml'))).results[0]!.resultCode).toBe(
        'PermanentFailure',
      );
    });
  });
}

describeIntakeOn('memory', async () => createMemoryStore());
const at = endpoint;
if (at === undefined)
  process.stdout.write(
    'left out: intake and backfill on a real S3-protocol server (TALLYPOST_S3_ENDPOINT is not set)\n',
  );
else
  describeIntakeOn('an S3-protocol server', async () => {
    const client = createShimmedClient(at);
    return createS3Store({ client, bucket: await makeBucket(client), prefix: 'desk' });
  });
