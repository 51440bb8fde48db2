import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { S3Client } from '@aws-sdk/client-s3';
import { afterAll, describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { eraseMessages } from '../../src/ledger/erase.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { changeQueue, type QueueChange } from '../../src/ledger/queues.ts';
import { recount } from '../../src/ledger/recount.ts';
import { restoreVersion } from '../../src/ledger/restore.ts';
import { undoConfirmations } from '../../src/ledger/undo.ts';
import { encodeFeatures } from '../../src/model/codec-entries.ts';
import { createDirectoryStore } from '../../src/store/directory.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { createS3Store } from '../../src/store/s3.ts';
import type { Store } from '../../src/store/store.ts';
import { startLoopbackS3 } from '../lambda/loopback-s3.ts';
import {
  claim,
  desk,
  featuresOf,
  fold,
  keysOf,
  schema,
  standings,
  startMs,
  testWorld,
  tokenOf,
} from './fixture.ts';
import { tokensIn } from './tokens-in.ts';

type TestWorld = ReturnType<typeof testWorld>;
interface Opened {
  readonly store: Store;
  /** Everything that the store's medium holds, beside what its own calls show: for a directory, the files. */
  readonly medium: () => readonly Buffer[];
}

const cleanups: (() => unknown)[] = [];
afterAll(async () => {
  for (const cleanup of cleanups) await cleanup();
});

const openings: Record<string, () => Promise<Opened>> = {
  memory: async () => ({ store: createMemoryStore(), medium: () => [] }),
  directory: async () => {
    const folder = mkdtempSync(join(tmpdir(), 'ledger-'));
    cleanups.push(() => rmSync(folder, { recursive: true, force: true }));
    const medium = () =>
      readdirSync(folder, { recursive: true, withFileTypes: true })
        .filter((entry) => entry.isFile())
        .map((entry) =>
          Buffer.concat([Buffer.from(entry.name), readFileSync(join(entry.parentPath, entry.name))]),
        );
    return { store: createDirectoryStore(folder), medium };
  },
  'S3 protocol': async () => {
    const server = await startLoopbackS3(createMemoryStore(), 'desk-mail');
    const client = new S3Client({
      endpoint: server.endpoint,
      region: 'eu-west-2',
      forcePathStyle: true,
      credentials: { accessKeyId: 'testkey', secretAccessKey: 'testsecret' },
    });
    cleanups.push(() => {
      client.destroy();
      return server.close();
    });
    return { store: createS3Store({ client, bucket: 'desk-mail', prefix: 'north' }), medium: () => [] };
  },
};

const names = ['m1', 'm2', 'm3', 'm4', 'secret-1'];
const secretText = 'the cellar at Millrace Lane floods again';

async function bodies(store: Store): Promise<Map<string, Buffer>> {
  const found = new Map<string, Buffer>();
  for (const key of await keysOf(store)) {
    const got = await store.get(key);
    if (got.kind === 'found') found.set(key, Buffer.from(got.object.body));
  }
  return found;
}

async function learned(store: Store): Promise<TestWorld> {
  const world = testWorld(1, store);
  await store.put('config/desk.json', Buffer.from(JSON.stringify(desk)));
  await store.put('inbound/secret-1', Buffer.from(secretText));
  await fold(world, claim('m1', 'billing'), claim('m2', 'leaks'), claim('secret-1', 'leaks'));
  await compact(world, desk, schema);
  await fold(world, claim('m3', 'leaks', 1), claim('m1', 'meters', 2, 'import'), claim('m4', 'moving', 3));
  return world;
}

const since = { sinceMs: 0, untilMs: startMs + 3600_000 };
const change = (to: QueueChange) => (world: TestWorld, dryRun: boolean) =>
  changeQueue(world, desk, schema, to, { dryRun });

/** Each command, what its dry run says, what it says, and where the messages stand afterwards. */
const commands: readonly (readonly [
  name: string,
  run: (world: TestWorld, dryRun: boolean) => Promise<unknown>,
  dry: object,
  done: object,
  stands: Record<string, number>,
])[] = [
  [
    'compact',
    (world, dryRun) => compact(world, desk, schema, { dryRun }),
    { kind: 'dry-run', messages: 5, segments: 1 },
    { kind: 'compacted', messages: 5, segments: 1 },
    { billing: 0, leaks: 3, meters: 1, moving: 1 },
  ],
  [
    'recount',
    (world, dryRun) => recount(world, desk, schema, { repair: !dryRun }),
    { differences: [], messages: 5, repair: 'none' },
    { differences: [], messages: 5, repair: 'not-needed' },
    { billing: 0, leaks: 3, meters: 1, moving: 1 },
  ],
  [
    'undo',
    (world, dryRun) => undoConfirmations(world, schema, { by: 'import', ...since }, { dryRun }),
    { kind: 'dry-run', messages: 1, confirmations: 1 },
    { kind: 'undone', messages: 1, confirmations: 1, isDone: true },
    { billing: 1, leaks: 3, meters: 0, moving: 1 },
  ],
  [
    'queue rename',
    change({ kind: 'rename', from: 'leaks', to: 'bursts' }),
    { kind: 'dry-run', messages: 3 },
    { kind: 'changed', messages: 3, deskFile: 'updated' },
    { billing: 0, bursts: 3, meters: 1, moving: 1 },
  ],
  [
    'queue merge',
    change({ kind: 'merge', from: 'leaks', into: 'meters' }),
    { kind: 'dry-run', messages: 3 },
    { kind: 'changed', messages: 3, deskFile: 'updated' },
    { billing: 0, meters: 4, moving: 1 },
  ],
  [
    'queue retire',
    change({ kind: 'retire', queue: 'moving', successor: 'billing' }),
    { kind: 'dry-run', messages: 1 },
    { kind: 'changed', messages: 1, deskFile: 'updated' },
    { billing: 1, leaks: 3, meters: 1 },
  ],
  [
    'queue open',
    change({ kind: 'open', queue: 'sewers', title: 'Sewers' }),
    { kind: 'dry-run', messages: 0 },
    { kind: 'changed', messages: 0, deskFile: 'updated' },
    { billing: 0, leaks: 3, meters: 1, moving: 1, sewers: 0 },
  ],
  [
    'restore',
    (world, dryRun) => restoreVersion(world, desk, schema, 2, { dryRun }),
    { kind: 'dry-run', version: 3, segments: 1 },
    { kind: 'restored', to: 2, segments: 1 },
    { billing: 1, leaks: 2, meters: 0, moving: 0 },
  ],
  [
    'erase',
    (world, dryRun) => eraseMessages(world, schema, ['secret-1'], { dryRun }),
    { erasures: [{ kind: 'dry-run', confirmations: 1 }] },
    { isDone: true, erasures: [{ kind: 'erased', confirmations: 1 }] },
    { billing: 0, leaks: 2, meters: 1, moving: 1 },
  ],
];

describe.each(Object.entries(openings))('on the %s store', (_, open) => {
  it.each(commands)(
    '%s writes nothing in a dry run, then does what it said',
    async (_, run, dry, done, stands) => {
      const { store } = await open();
      const world = await learned(store);
      const before = await bodies(store);
      const said = await run(world, true);
      expect(said).toMatchObject(dry);
      expect(await bodies(store)).toEqual(before);
      const result = await run(world, false);
      expect(result).toMatchObject(done);
      // What --json prints is all of it.
      for (const value of [said, result]) expect(JSON.parse(JSON.stringify(value))).toEqual(value);
      const file = await store.get('config/desk.json');
      const now = JSON.parse(Buffer.from(file.kind === 'found' ? file.object.body : []).toString());
      const { scorer } = await loadModel(world, now, schema, null);
      expect(Object.fromEntries(scorer.queues.map((queue, k) => [queue, scorer.messages[k]]))).toEqual(
        stands,
      );
      expect(await recount(world, now, schema)).toMatchObject({ differences: [], fault: null });
    },
    60_000,
  );

  it('nothing is left of an erased message after a compaction and the horizon, in any byte of it', async () => {
    const { store, medium } = await open();
    const world = await learned(store);
    const token = tokenOf('secret-1');
    const needles = [
      'secret-1',
      secretText,
      encodeFeatures(featuresOf('secret-1')),
      Buffer.from(Float64Array.of(token).buffer),
      token.toString(16),
      String(token),
    ];
    const traces = async () => {
      const objects = await bodies(store);
      const packed = [...objects].filter(([key, body]) => tokensIn(key, body).includes(token));
      const all: Buffer[] = [
        ...medium(),
        ...objects.values(),
        ...[...objects.keys()].map((key) => Buffer.from(key)),
      ];
      return packed.length + all.filter((bytes) => needles.some((needle) => bytes.includes(needle))).length;
    };
    expect(await traces()).toBeGreaterThan(3);
    await eraseMessages(world, schema, ['secret-1']);
    await compact(world, desk, schema);
    // The key of the tombstone names it, and nothing else does; in a directory that key is a path.
    const tombstone = await store.get('histories/secret-1.json');
    expect(tombstone).toMatchObject({ kind: 'found' });
    expect(await traces()).toBe(1);
    world.clock.ms += bounds.horizonMs + 24 * 3600_000;
    await compact(world, desk, schema);
    expect(await traces()).toBe(1);
    expect(await standings(world, names)).toEqual({ m1: 'meters', m2: 'leaks', m3: 'leaks', m4: 'moving' });
  }, 60_000);
});
