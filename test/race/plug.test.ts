import { type ChildProcess, fork } from 'node:child_process';
import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { recount } from '../../src/ledger/recount.ts';
import type { World } from '../../src/ledger/world.ts';
import { createDirectoryStore } from '../../src/store/directory.ts';
import { desk, schema, startMs } from '../ledger/fixture.ts';
import { bundleChild } from '../store/child.ts';
import { bodyOf, makeDeliveries } from './claims.ts';
import { judge } from './run-race.ts';
import type { Answer, Order, WireClaim } from './worker.ts';

/** TALLYPOST_RACE=full runs what continuous integration runs; without it a tenth. */
const killsWanted = process.env.TALLYPOST_RACE === 'full' ? 200 : 20;
const seed = Number(process.env.TALLYPOST_RACE_SEED ?? Date.now() % 1_000_000);

const root = mkdtempSync(join(tmpdir(), 'tallypost-plug-'));
let worker: string;
beforeAll(async () => {
  worker = await bundleChild('../race/worker.ts', join(root, 'worker.mjs'));
});
afterAll(() => rmSync(root, { recursive: true, force: true }), 120_000);

const place = { kind: 'directory', path: join(root, 'store') } as const;

/** A process that is ready to work. */
function startWorker(): Promise<ChildProcess> {
  const child = fork(worker, [JSON.stringify(place)], {
    execArgv: [],
    stdio: ['ignore', 'ignore', 'inherit', 'ipc'],
  });
  return new Promise((resolve, reject) => {
    child.once('message', () => resolve(child));
    child.once('error', reject);
  });
}

/** Works orders off one after the other until the process is done or dead; gives the answers that came. */
function work(child: ChildProcess, orders: readonly Order[]): Promise<Answer[]> {
  const answers: Answer[] = [];
  return new Promise((resolve) => {
    child.once('exit', () => resolve(answers));
    child.on('message', (answer: Answer) => {
      answers.push(answer);
      const next = orders[answers.length];
      if (next !== undefined && child.connected) child.send(next, () => {});
      else if (next === undefined) resolve(answers);
    });
    child.send(orders[0] as Order);
  });
}

describe(`a process on a directory is killed ${killsWanted} times at any moment (seed ${seed})`, () => {
  it('and the store opens every time, whole, and the recount agrees', async () => {
    // Many confirmations of few messages: every kill is followed by a recount, which reads every history.
    const deliveries = makeDeliveries(seed, {
      messages: killsWanted,
      corrections: killsWanted * 4,
      repeats: killsWanted * 2,
    });
    let waiting = deliveries.claims.map(
      ({ confirmation: { message, queue, by, at } }): WireClaim => ({
        message,
        queue,
        by,
        minute: (Date.parse(at) - startMs) / 60_000,
      }),
    );
    const marked: string[] = [];
    const world: World = {
      store: createDirectoryStore(place.path),
      nowMs: Date.now,
      random: Math.random,
      sleep: async () => {},
    };
    let usualMs = 200;
    let inTheMiddle = 0;
    let next = startWorker();

    for (let kills = 0; kills < killsWanted; kills += 1) {
      const child = await next;
      next = startWorker(); // Starts while this one works.
      const claims = waiting.slice(0, 6);
      waiting = waiting.slice(6);
      marked.push(`m${kills}`);
      const orders: Order[] = [
        { kind: 'fold', claims: claims.slice(0, 3) },
        { kind: 'mark', message: `m${kills}` },
        ...(kills % 3 === 0 ? [{ kind: 'compact' } as const] : []),
        { kind: 'fold', claims: claims.slice(3) },
      ];
      const startedMs = performance.now();
      const working = work(child, orders);
      const timer = setTimeout(() => child.kill('SIGKILL'), Math.random() * usualMs * 1.1);
      const answers = await working;
      clearTimeout(timer);
      child.kill('SIGKILL');
      if (answers.length < orders.length) inTheMiddle += 1;
      // On a busy machine the first guess may be too short for anything to be done before the kill.
      if (answers.length === 0) usualMs *= 1.5;
      else if (answers.length === orders.length)
        usualMs = usualMs * 0.8 + (performance.now() - startedMs) * 0.2;

      // What was not answered, or answered with `retry`, is delivered again, as a queue would.
      const folds = answers.filter((answer) => answer.kind === 'folded');
      const outcomes = [0, 1].flatMap((i) => folds[i]?.outcomes ?? [0, 1, 2].map(() => 'retry'));
      waiting.push(...claims.filter((_, i) => outcomes[i] === 'retry'));
      expect(answers.filter((answer) => answer.kind === 'threw')).toEqual([]);

      const counted = await recount(world, desk, schema);
      expect({ kills, differences: counted.differences, fault: counted.fault }).toEqual({
        kills,
        differences: [],
        fault: null,
      });
      for (const message of marked.slice(-3)) {
        const got = await world.store.get(`inbound/${message}.eml`);
        // Only the last process may have died before its message was stored.
        if (got.kind === 'missing' && message === marked.at(-1)) continue;
        expect(
          got.kind === 'found' && Buffer.from(got.object.body).equals(Buffer.from(bodyOf(message))),
        ).toBe(true);
      }
      const last = await world.store.head(`inbound/${marked.at(-1)}.eml`);
      if (last === null) marked.pop();
    }

    const child = await next;
    for (let round = 0; waiting.length > 0; round += 1) {
      expect(round).toBeLessThan(200);
      const claims = waiting.splice(0, 20);
      const [answer] = await work(child, [{ kind: 'fold', claims }]);
      const outcomes = answer?.kind === 'folded' ? answer.outcomes : [];
      const again = claims.filter(
        (_, i) => outcomes[i] !== 'folded' && outcomes[i] !== 'already' && outcomes[i] !== 'stale',
      );
      waiting.push(...again);
      // A dead process's claims are left alone for a while before they are taken over.
      if (again.length > 0) await new Promise((resolve) => setTimeout(resolve, 200));
      child.removeAllListeners('message');
    }
    child.kill('SIGKILL');
    process.stdout.write(
      `plug pulled ${killsWanted} times, ${inTheMiddle} of them in the middle of work; usual length of work ${usualMs.toFixed(0)} ms\n`,
    );
    expect(await judge(place, deliveries)).toEqual({
      cells: 0,
      misplaced: [],
      counted: deliveries.messages.length,
    });
    expect(inTheMiddle).toBeGreaterThan(killsWanted / 4);
    // A plain copy may be missing where its writer died before making it, but is never half made.
    const seen = readdirSync(join(place.path, 'inbound'));
    for (const name of seen)
      expect(readFileSync(join(place.path, 'inbound', name)).equals(bodyOf(name.replace('.eml', '')))).toBe(
        true,
      );
    expect(seen.length).toBeGreaterThan(0);
  }, 900_000);
});
