import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { bundleChild } from '../store/child.ts';
import { makeDeliveries } from './claims.ts';
import type { Place } from './place.ts';
import { judge, runRace } from './run-race.ts';
import { createShimmedClient, endpoint, makeBucket } from './s3-shim.ts';

/** TALLYPOST_RACE=full runs what continuous integration runs; without it a tenth, on the directory store only. */
const isFull = process.env.TALLYPOST_RACE === 'full';
const seed = Number(process.env.TALLYPOST_RACE_SEED ?? Date.now() % 1_000_000);
const size = isFull
  ? { messages: 1500, corrections: 500, repeats: 300 }
  : { messages: 150, corrections: 50, repeats: 30 };
const processes = isFull ? 8 : 4;
const killEveryMs = isFull ? 3000 : 600;

const server = endpoint;
const root = mkdtempSync(join(tmpdir(), 'tallypost-race-'));
let worker: string;
beforeAll(async () => {
  worker = await bundleChild('../race/worker.ts', join(root, 'worker.mjs'));
});
afterAll(() => rmSync(root, { recursive: true, force: true }), 120_000);

async function race(place: Place, batch: number): Promise<void> {
  const deliveries = makeDeliveries(seed, size);
  const startedMs = Date.now();
  const report = await runRace({
    worker,
    place,
    processes,
    batch,
    killEveryMs,
    compactEveryBatches: isFull ? 25 : 15,
    deliveries,
  });
  const seconds = ((Date.now() - startedMs) / 1000).toFixed(1);
  const verdict = await judge(place, deliveries);
  process.stdout.write(
    `race on ${place.kind}, seed ${seed}, ${seconds} s: ${JSON.stringify({ ...report, ...verdict })}\n`,
  );
  expect(verdict).toEqual({ cells: 0, misplaced: [], counted: size.messages });
  expect(report.thrown).toEqual([]);
  expect(report.kills).toBeGreaterThan(0);
}

describe(`${processes} processes fold ${size.messages + size.corrections} confirmations and one is killed every ${killEveryMs} ms (seed ${seed})`, () => {
  it('on a directory: each stands once, under its newest queue', async () => {
    await race({ kind: 'directory', path: join(root, 'store') }, 5);
  }, 1_200_000);

  if (server !== undefined && isFull)
    it('on an S3-protocol server: each stands once, under its newest queue', async () => {
      const bucket = await makeBucket(createShimmedClient(server));
      await race({ kind: 's3', endpoint: server, bucket }, 20);
    }, 1_200_000);
  else
    process.stdout.write(
      'left out: the race on a real S3-protocol server (needs TALLYPOST_S3_ENDPOINT and TALLYPOST_RACE=full)\n',
    );
});
