import { describe, expect, it } from 'vitest';
import type { Desk } from '../../src/desk/desk.ts';
import { readDesk } from '../../src/desk/read-desk.ts';
import { createExtractor } from '../../src/features/extractor.ts';
import { createBackfillHandler } from '../../src/handlers/backfill.ts';
import { createConfirmHandler } from '../../src/handlers/confirm.ts';
import type { HandlerDeps } from '../../src/handlers/handler-deps.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { recount } from '../../src/ledger/recount.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';

const utf8 = new TextEncoder();
const desk: Desk = readDesk(
  utf8.encode(
    JSON.stringify({
      version: 1,
      name: 'Fenmark Water',
      queues: [
        { id: 'billing', title: 'Billing' },
        { id: 'careers', title: 'Careers' },
      ],
      costs: { lookMinutes: 1, wrongRouteMinutes: 10 },
    }),
  ),
  'desk.json',
);

function depsOf(store: Store): HandlerDeps & { lines: unknown[] } {
  const lines: unknown[] = [];
  let state = 7;
  const random = () => {
    state = (state * 16807) % 2147483647;
    return state / 2147483647;
  };
  return {
    world: { store, nowMs: () => Date.parse('2026-05-01T00:00:00Z'), random, sleep: async () => {} },
    loadDesk: async () => desk,
    tokenKey: new Uint8Array(16),
    log: (line) => lines.push(line),
    prefix: '',
    lines,
  };
}

const mail =
  'From: a@b.example\r\nDate: Mon, 03 Mar 2025 10:00:00 +0100\r\nSubject: bill\r\n\r\nMy bill is wrong.\r\n';
const job = (s3Key: string, userArguments?: Record<string, string>) => ({
  invocationSchemaVersion: userArguments === undefined ? '1.0' : '2.0',
  invocationId: 'invocation-1',
  job: { id: 'job-1', ...(userArguments === undefined ? {} : { userArguments }) },
  tasks: [{ taskId: 'task-1', s3Key }],
});

async function dropsOf(store: Store): Promise<{ key: string; value: unknown }[]> {
  const found = [];
  for await (const { key } of store.list('confirmations/')) {
    const got = await store.get(key);
    if (got.kind === 'found') found.push({ key, value: JSON.parse(Buffer.from(got.object.body).toString()) });
  }
  return found;
}

describe('backfill of labelled mail', () => {
  it('drops a confirmation for the folder’s queue, dated as the mail is, and folds it exactly once however often the job runs', async () => {
    const store = createMemoryStore();
    await store.put('inbound/archive/billing/2025/a b.eml', utf8.encode(mail));
    const deps = depsOf(store);
    const handle = createBackfillHandler(deps);
    const result = await handle(job('inbound/archive/billing/2025/a+b.eml'));
    expect(result).toEqual({
      invocationSchemaVersion: '1.0',
      treatMissingKeysAs: 'PermanentFailure',
      invocationId: 'invocation-1',
      results: [{ taskId: 'task-1', resultCode: 'Succeeded', resultString: 'billing' }],
    });
    const drops = await dropsOf(store);
    expect(drops.map((one) => one.value)).toEqual([
      // 10:00 at +01:00; the memory store's own clock is later than that.
      {
        message: 'archive/billing/2025/a b.eml',
        queue: 'billing',
        by: 'backfill',
        at: '2025-03-03T09:00:00.000Z',
      },
    ]);
    const confirm = createConfirmHandler(deps);
    const event = {
      Records: [
        {
          eventSource: 'aws:s3',
          eventVersion: '2.1',
          eventName: 'ObjectCreated:Put',
          s3: { object: { key: drops[0]!.key } },
        },
      ],
    };
    await confirm(event);
    expect(await dropsOf(store)).toEqual([]);
    await handle(job('inbound/archive/billing/2025/a+b.eml'));
    await confirm(event);
    expect(await dropsOf(store)).toEqual([]);
    const history = await store.get('histories/archive/billing/2025/a b.eml.json');
    if (history.kind !== 'found') throw new Error('no history');
    expect(JSON.parse(Buffer.from(history.object.body).toString()).placements).toHaveLength(1);
  });

  it('takes the queue from the job’s argument before the folder', async () => {
    const store = createMemoryStore();
    await store.put('inbound/archive/2019/x.eml', utf8.encode(mail));
    const result = await createBackfillHandler(depsOf(store))(
      job('inbound/archive/2019/x.eml', { queue: 'careers' }),
    );
    expect(result.results[0]).toMatchObject({ resultCode: 'Succeeded', resultString: 'careers' });
  });

  it.each([
    ['a key outside of the archive', 'inbound/x.eml', /archive/],
    ['a key that is not encoded', 'inbound/archive/billing/%zz', /archive/],
    ['an unknown queue', 'inbound/archive/gardening/x.eml', /queue/],
    ['a missing object', 'inbound/archive/billing/none.eml', /object/],
  ])('refuses %s for good', async (_name, key, why) => {
    const store = createMemoryStore();
    const { results } = await createBackfillHandler(depsOf(store))(job(key));
    expect(results[0]!.resultCode).toBe('PermanentFailure');
    expect(results[0]!.resultString).toMatch(why);
    expect(await dropsOf(store)).toEqual([]);
  });

  // As documented: Amazon S3 User Guide, "Invoke AWS Lambda function", and AWS Lambda Developer Guide, "Invoke a Lambda function
  // with Amazon S3 batch events".
  it.each<[string, object, object]>([
    [
      '1.0',
      { id: 'f3cc4f60-61f6-4a2b-8a21-d07600c373ce' },
      { s3VersionId: '1', s3BucketArn: 'arn:aws:s3:::fenmark-mail' },
    ],
    [
      '2.0',
      { id: 'f3cc4f60-61f6-4a2b-8a21-d07600c373ce', userArguments: { queue: 'careers' } },
      { s3VersionId: null, s3Bucket: 'fenmark-mail' },
    ],
  ])(
    'takes an event of schema %s as it is documented, and answers in its form',
    async (version, itsJob, more) => {
      const store: Store = { ...createMemoryStore(), place: 's3://fenmark-mail' };
      await store.put('inbound/archive/billing/1.eml', utf8.encode(mail));
      const event = {
        invocationSchemaVersion: version,
        invocationId: 'YXNkbGZqYWRmaiBhc2RmdW9hZHNmZGpmaGFzbGtkaGZza2RmaAo',
        job: itsJob,
        tasks: [{ taskId: 'dGFza2lkZ29lc2hlcmUK', s3Key: 'inbound/archive/billing/1.eml', ...more }],
      };
      const answer = await createBackfillHandler(depsOf(store))(event as never);
      expect(answer).toEqual({
        invocationSchemaVersion: version,
        treatMissingKeysAs: 'PermanentFailure',
        invocationId: 'YXNkbGZqYWRmaiBhc2RmdW9hZHNmZGpmaGFzbGtkaGZza2RmaAo',
        results: [
          {
            taskId: 'dGFza2lkZ29lc2hlcmUK',
            resultCode: 'Succeeded',
            resultString: version === '1.0' ? 'billing' : 'careers',
          },
        ],
      });
      const elsewhere = structuredClone(event);
      Object.assign(
        elsewhere.tasks[0]!,
        version === '1.0' ? { s3BucketArn: 'arn:aws:s3:::other' } : { s3Bucket: 'other' },
      );
      const refused = await createBackfillHandler(depsOf(store))(elsewhere as never);
      expect(refused.results[0]).toMatchObject({
        resultCode: 'PermanentFailure',
        resultString: 'expected a key of this desk’s bucket',
      });
    },
  );

  it('refuses an event of a schema that it does not know', async () => {
    const { results } = await createBackfillHandler(depsOf(createMemoryStore()))({
      ...job('inbound/archive/billing/x.eml'),
      invocationSchemaVersion: '3.0',
    });
    expect(results).toEqual([
      {
        taskId: 'task-1',
        resultCode: 'PermanentFailure',
        resultString: 'expected invocation schema 1.0 or 2.0',
      },
    ]);
  });

  it('finds a key whose plus stands for itself as well as one whose plus stands for a space', async () => {
    const store = createMemoryStore();
    await store.put('inbound/archive/billing/a+b.eml', utf8.encode(mail));
    await store.put('inbound/archive/billing/c d.eml', utf8.encode(mail));
    const handle = createBackfillHandler(depsOf(store));
    for (const key of ['a+b', 'a%2Bb', 'c+d', 'c%20d'])
      expect((await handle(job(`inbound/archive/billing/${key}.eml`))).results[0]!.resultCode).toBe(
        'Succeeded',
      );
    expect((await dropsOf(store)).map(({ value }) => (value as { message: string }).message).sort()).toEqual([
      'archive/billing/a+b.eml',
      'archive/billing/c d.eml',
    ]);
  });

  it('counts each message once when a job is stopped, folded half, resumed from its start and run beside itself', async () => {
    const store = createMemoryStore();
    const keys = Array.from(
      { length: 40 },
      (_, i) => `inbound/archive/${i % 3 === 0 ? 'careers' : 'billing'}/${i}.eml`,
    );
    for (const [i, key] of keys.entries())
      await store.put(key, utf8.encode(mail.replace('wrong', `wrong by ${i} pounds`)));
    const deps = depsOf(store);
    const handle = createBackfillHandler(deps);
    const confirm = createConfirmHandler(deps);
    const fold = async () => {
      const drops = await dropsOf(store);
      return confirm({
        Records: drops.map(({ key }) => ({
          eventSource: 'aws:s3',
          eventVersion: '2.1',
          eventName: 'ObjectCreated:Put',
          s3: { object: { key } },
        })),
      });
    };
    const run = async (part: readonly string[]) => {
      for (const key of part) expect((await handle(job(key))).results[0]!.resultCode).toBe('Succeeded');
    };
    await run(keys.slice(0, 17));
    await fold();
    await Promise.all([run(keys), run([...keys].reverse())]);
    await fold();
    await run(keys);
    await fold();
    expect(await dropsOf(store)).toEqual([]);
    const extractor = createExtractor(desk, deps.tokenKey);
    const counted = await recount(deps.world, desk, extractor.schema);
    // 0, 3, ... 39 are 14 of 40.
    expect([counted.messages, counted.differences]).toEqual([40, []]);
    const { scorer } = await loadModel(deps.world, desk, extractor.schema, null);
    expect([...scorer.messages].map(Math.round)).toEqual([26, 14]);
    expect(scorer.queues).toEqual(['billing', 'careers']);
  });

  it('asks to be called again when the store fails', async () => {
    const failing: Store = { ...createMemoryStore(), stream: async () => Promise.reject(new Error('down')) };
    const deps = depsOf(failing);
    const { results } = await createBackfillHandler(deps)(job('inbound/archive/billing/x.eml'));
    expect(results[0]!.resultCode).toBe('TemporaryFailure');
    expect(deps.lines).toMatchObject([{ level: 'error', event: 'backfill-failed' }]);
  });
});
