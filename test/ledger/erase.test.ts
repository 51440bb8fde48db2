import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { eraseMessages } from '../../src/ledger/erase.ts';
import { loadModel } from '../../src/ledger/load-model.ts';
import { recount } from '../../src/ledger/recount.ts';
import { encodeFeatures } from '../../src/model/codec-entries.ts';
import { keys } from '../../src/store/keys.ts';
import { claim, desk, featuresOf, fold, keysOf, schema, standings, testWorld, tokenOf } from './fixture.ts';
import { tokensIn } from './tokens-in.ts';

type TestWorld = ReturnType<typeof testWorld>;
const secretText = 'the cellar at Millrace Lane floods again';

async function bodies(world: TestWorld): Promise<[string, Uint8Array][]> {
  const found: [string, Uint8Array][] = [];
  for (const key of await keysOf(world.store)) {
    const got = await world.store.get(key);
    if (got.kind === 'found') found.push([key, got.object.body]);
  }
  return found;
}

/** Objects that hold the message's id, its text, its packed features, or its own token in any form. */
async function traces(world: TestWorld, message: string): Promise<string[]> {
  const token = tokenOf(message);
  const found = (await bodies(world)).filter(([key, body]) => {
    const bytes = Buffer.from(body);
    const asDouble = Buffer.from(Float64Array.of(token).buffer);
    return (
      bytes.includes(message) ||
      bytes.includes(secretText) ||
      bytes.includes(encodeFeatures(featuresOf(message))) ||
      bytes.includes(asDouble) ||
      bytes.includes(token.toString(16)) ||
      bytes.includes(String(token)) ||
      tokensIn(key, body).includes(token)
    );
  });
  return found.map(([key]) => key);
}

async function storeWithSecret(): Promise<TestWorld> {
  const world = testWorld();
  await world.store.put('inbound/secret-1', Buffer.from(secretText));
  await fold(world, claim('secret-1', 'leaks'), claim('m2', 'leaks'), claim('m3', 'billing'));
  await compact(world, desk, schema);
  await fold(world, claim('secret-1', 'meters', 5));
  await world.store.put(
    'confirmations/d1.json',
    Buffer.from('{"message":"secret-1","queue":"leaks","by":"ann","at":"2026-03-02T01:00:00Z"}'),
  );
  await world.store.put(
    'confirmations/d2.json',
    Buffer.from('{"message":"m2","queue":"leaks","by":"ann","at":"2026-03-02T01:00:00Z"}'),
  );
  await world.store.put(
    'confirmations-refused/d3.json',
    Buffer.from('{"code":"x","drop":{"message":"secret-1"}}'),
  );
  return world;
}

describe('an erasure', () => {
  it('takes the message out of what routers use at once', async () => {
    const world = await storeWithSecret();
    expect(await eraseMessages(world, schema, ['secret-1'])).toMatchObject({
      isDone: true,
      erasures: [{ message: 'secret-1', kind: 'erased', confirmations: 2 }],
    });
    const { scorer } = await loadModel(world, desk, schema, null);
    // billing, leaks, meters, moving: m3, m2 and nothing else.
    expect([...scorer.messages]).toEqual([1, 1, 0, 0]);
    expect((await recount(world, desk, schema)).differences).toEqual([]);
  });

  it('deletes the raw message, its waiting and refused confirmations, and what its history says, at once', async () => {
    const world = await storeWithSecret();
    await eraseMessages(world, schema, ['secret-1']);
    expect(await keysOf(world.store, keys.inbound)).toEqual([]);
    expect(await keysOf(world.store, keys.confirmations)).toEqual(['confirmations/d2.json']);
    expect(await keysOf(world.store, keys.refusedConfirmations)).toEqual([]);
    const left = await world.store.get('histories/secret-1.json');
    expect(
      left.kind === 'found' && Object.keys(JSON.parse(Buffer.from(left.object.body).toString())),
    ).toEqual(['format', 'rev', 'erasedAt']);
    // Only packed objects still hold it, as the traces say.
    for (const key of await traces(world, 'secret-1'))
      expect(key).toMatch(/^model\/(segments|bases|tables)\//);
  });

  it('leaves 0 bytes of the message in any object after the next compaction, and after the horizon', async () => {
    const world = await storeWithSecret();
    expect((await traces(world, 'secret-1')).length).toBeGreaterThan(5);
    await eraseMessages(world, schema, ['secret-1']);
    await compact(world, desk, schema);
    expect(await traces(world, 'secret-1')).toEqual([]);
    world.clock.ms += bounds.horizonMs + 24 * 3600_000;
    await compact(world, desk, schema);
    expect(await traces(world, 'secret-1')).toEqual([]);
    expect(await standings(world, ['secret-1', 'm2', 'm3'])).toEqual({ m2: 'leaks', m3: 'billing' });
  });

  it('does so for a message that had been undone before, whose counts stand nowhere', async () => {
    const world = await storeWithSecret();
    const { undoConfirmations } = await import('../../src/ledger/undo.ts');
    await undoConfirmations(world, schema, { by: 'ann', sinceMs: 0, untilMs: world.clock.ms + 1e9 });
    await compact(world, desk, schema);
    await eraseMessages(world, schema, ['secret-1']);
    await compact(world, desk, schema);
    expect(await traces(world, 'secret-1')).toEqual([]);
  });

  it('is final: late confirmations are refused, also of a message that was never confirmed before', async () => {
    const world = await storeWithSecret();
    await eraseMessages(world, schema, ['secret-1', 'unseen']);
    for (const message of ['secret-1', 'unseen'])
      expect(await fold(world, claim(message, 'leaks', 50))).toMatchObject([
        { kind: 'refused', fault: { code: 'message-erased', place: `histories/${message}.json` } },
      ]);
    expect(await eraseMessages(world, schema, ['secret-1'])).toMatchObject({
      erasures: [{ kind: 'already' }],
    });
  });

  it('changes nothing in a dry run', async () => {
    const world = await storeWithSecret();
    const before = await bodies(world);
    expect(await eraseMessages(world, schema, ['secret-1'], { dryRun: true })).toMatchObject({
      erasures: [{ kind: 'dry-run', confirmations: 2 }],
    });
    expect(await bodies(world)).toEqual(before);
  });

  it('that was begun by a process that died is finished by the next compaction', async () => {
    const world = await storeWithSecret();
    const order = { kind: 'erase', messages: ['secret-1'], atMs: world.clock.ms };
    await world.store.put(`${keys.orders}0mm8eww00-000000000000.json`, Buffer.from(JSON.stringify(order)));
    world.clock.ms += 60_000;
    await compact(world, desk, schema);
    expect(await traces(world, 'secret-1')).toEqual([]);
  });
});
