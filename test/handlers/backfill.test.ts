import { describe, expect, it } from 'vitest';
import type { Desk } from '../../src/desk/desk.ts';
import { readDesk } from '../../src/desk/read-desk.ts';
import { createBackfillHandler } from '../../src/handlers/backfill.ts';
import { createConfirmHandler } from '../../src/handlers/confirm.ts';
import type { HandlerDeps } from '../../src/handlers/handler-deps.ts';
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

  it('asks to be called again when the store fails', async () => {
    const failing: Store = { ...createMemoryStore(), stream: async () => Promise.reject(new Error('down')) };
    const deps = depsOf(failing);
    const { results } = await createBackfillHandler(deps)(job('inbound/archive/billing/x.eml'));
    expect(results[0]!.resultCode).toBe('TemporaryFailure');
    expect(deps.lines).toMatchObject([{ level: 'error', event: 'backfill-failed' }]);
  });
});
