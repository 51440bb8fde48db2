import { mkdtemp, readFile, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { keys } from '../../src/store/keys.ts';
import { openStore } from '../../src/store/open-store.ts';
import { deskFile, labelled, lay, mail, runCli } from './run-cli.ts';

let root: string;
let store: string;
beforeEach(async () => {
  root = await mkdtemp(join(tmpdir(), 'tallypost-desk-'));
  store = join(root, 'store');
});
afterEach(() => rm(root, { recursive: true, force: true }));

const old = JSON.parse(deskFile);
/** A further address and a reference change what is counted; a further queue alone does not. */
const counting = {
  ...old,
  ownAddresses: ['bills@desk.example'],
  references: [{ id: 'job', pattern: 'J####' }],
};
const opening = { ...old, queues: [...old.queues, { id: 'meters', title: 'Meters' }] };

async function learn(count: number): Promise<void> {
  await lay(store, { 'config/desk.json': deskFile });
  const items = labelled(count);
  await lay(
    store,
    Object.fromEntries(items.map(({ text }, i) => [`inbound/m${i}.eml`, mail('Request', text)])),
  );
  await runCli('run', '--store', store);
  await lay(
    store,
    Object.fromEntries(
      items.map(({ queue }, i) => {
        const at = new Date(Date.UTC(2026, 2, 1 + i)).toISOString();
        return [`confirmations/c${i}.json`, JSON.stringify({ message: `m${i}.eml`, queue, by: 'ann', at })];
      }),
    ),
  );
  expect((await runCli('run', '--store', store)).code).toBe(0);
}

const change = async (desk: unknown, ...flags: string[]) => {
  await lay(root, { 'new.json': JSON.stringify(desk) });
  return runCli('desk', '--store', store, join(root, 'new.json'), '--json', ...flags);
};
const deskInStore = async () => JSON.parse(await readFile(join(store, 'config/desk.json'), 'utf8'));

describe('desk', () => {
  it('puts a file that counts the same, and says which queues come and go', async () => {
    await learn(3);
    const { code, json } = await change(opening);
    expect(code).toBe(0);
    expect(json()).toEqual({
      kind: 'changed',
      opened: ['meters'],
      closed: [],
      countsOtherwise: false,
      recounted: null,
    });
    expect(await deskInStore()).toEqual(opening);
    expect((await change(old)).json()).toMatchObject({ opened: [], closed: ['meters'] });
  });

  it('counts everything again under a file that counts otherwise: from raw messages, or from what histories keep', async () => {
    await learn(12);
    const opened = await openStore(store);
    // The raw form of a quarter has expired, of every queue's one: what is unknown of them must not look like a queue.
    for (let i = 0; i < 12; i += 4) await opened.delete(`${keys.inbound}m${i}.eml`);
    const { code, json } = await change(counting);
    expect(code).toBe(0);
    expect(json()).toEqual({
      kind: 'changed',
      opened: [],
      closed: [],
      countsOtherwise: true,
      recounted: { messages: 12, raw: 9, translated: 3, leftOut: 0 },
    });
    const recount = (await runCli('recount', '--store', store, '--json')).json();
    expect(recount).toMatchObject({ isRight: true, messages: 12 });
    // It routes and learns on under the new file.
    await lay(store, { 'inbound/next.eml': mail('Bill', 'my bill is wrong and I paid it') });
    const { json: ran } = await runCli('run', '--store', store, '--json');
    expect(ran()).toMatchObject({ failed: 0 });
    const head = await opened.head('inbound/next.eml');
    expect(head!.metadata).toMatchObject({ 'tallypost-queue': 'billing' });
    expect(head!.metadata['tallypost-reason']).not.toBe('model-unusable');
    await runCli('confirm', '--store', store, 'next.eml', 'billing', '--by', 'bob');
    await runCli('run', '--store', store);
    expect((await runCli('recount', '--store', store, '--json')).json()).toMatchObject({
      isRight: true,
      messages: 13,
    });
  });

  it('counts again under the file that stands, when what was counted is of another key or version', async () => {
    await learn(6);
    const opened = await openStore(store);
    await opened.delete(`${keys.inbound}m0.eml`);
    await opened.put(keys.tokenKey, Buffer.from('00112233445566778899aabbccddeeff\n'));
    const { code, json } = await change(old);
    expect(code).toBe(0);
    // Words hashed under another key cannot be carried over.
    expect(json()).toMatchObject({
      countsOtherwise: true,
      recounted: { messages: 5, raw: 5, translated: 0, leftOut: 1 },
    });
    expect((await runCli('recount', '--store', store, '--json')).json()).toMatchObject({
      isRight: true,
      messages: 5,
    });
  });

  it('changes nothing with --dry-run, nor for a file that cannot be used', async () => {
    await learn(3);
    const before = (await (await openStore(store)).get(keys.manifest)) as { object: { etag: string } };
    expect((await change(counting, '--dry-run')).json()).toMatchObject({
      kind: 'dry-run',
      countsOtherwise: true,
    });
    expect((await change({ ...counting, queues: [] })).code).toBe(2);
    expect((await runCli('desk', '--store', store, join(root, 'none.json'))).code).toBe(2);
    expect(await deskInStore()).toEqual(old);
    const after = (await (await openStore(store)).get(keys.manifest)) as { object: { etag: string } };
    expect(after.object.etag).toBe(before.object.etag);
  });

  it('works before anything was learned', async () => {
    await lay(store, { 'config/desk.json': deskFile });
    expect((await change(counting)).json()).toMatchObject({
      kind: 'changed',
      recounted: { messages: 0, leftOut: 0 },
    });
    expect(await deskInStore()).toEqual(counting);
  });
});
