import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { queueEvent } from '../../src/handlers/local-runner.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { startLoopbackS3 } from '../lambda/loopback-s3.ts';
import { type StartedFunction, startFunction } from '../lambda/runtime.ts';

const project = fileURLToPath(new URL('../../', import.meta.url));
const root = mkdtempSync(join(tmpdir(), 'tallypost-memory-'));
const store = createMemoryStore();
let s3: Awaited<ReturnType<typeof startLoopbackS3>>;
let route: StartedFunction;

beforeAll(async () => {
  execFileSync(process.execPath, [join(project, '.config/bundle.mjs'), '--functions', `--into=${root}`], {
    stdio: 'ignore',
  });
  s3 = await startLoopbackS3(store, 'fenmark-mail');
  await store.put('config/desk.json', readFileSync(join(project, 'events/desk.json')));
  route = await startFunction(join(root, 'functions/route/index.mjs'), {
    AWS_ENDPOINT_URL_S3: s3.endpoint,
    TALLYPOST_BUCKET: 'fenmark-mail',
    TALLYPOST_TOKEN_KEY: '000102030405060708090a0b0c0d0e0f',
  });
}, 120_000);
afterAll(async () => {
  await route.stop();
  await s3.close();
  rmSync(root, { recursive: true, force: true });
});

/** A letter with a file, of `bytes` in all. */
function largeMail(bytes: number): Buffer {
  const head = [
    'From: Ana Reed <ana@home.test>',
    'To: help@fenmarkwater.example',
    'Subject: Photographs of the meter',
    'MIME-Version: 1.0',
    'Content-Type: multipart/mixed; boundary=frontier',
    '',
    '--frontier',
    'Content-Type: text/plain; charset=utf-8',
    '',
    'The meter shows a wrong reading, please see the pictures.',
    '--frontier',
    'Content-Type: image/jpeg; name="meter.jpg"',
    'Content-Disposition: attachment',
    'Content-Transfer-Encoding: base64',
    '',
    '',
  ].join('\r\n');
  const tail = '\r\n--frontier--\r\n';
  const line = `${'/9j4AAQSkZJR'.repeat(6)}+AbC\r\n`;
  const lines = line.repeat(Math.floor((bytes - head.length - tail.length) / line.length));
  return Buffer.from(head + lines + tail, 'latin1');
}

describe('the built route function', () => {
  // 40 MB is the most that the receiving service takes (Amazon SES, "Email receiving quotas").
  it.each([1, 10])(
    'routes a batch of %i mails of 40 MB in less than 256 MB',
    async (count) => {
      const mail = largeMail(40 * 1024 * 1024);
      const keys = Array.from({ length: count }, (_, i) => `inbound/large-${count}-${i}`);
      for (const key of keys) await store.put(key, mail, { contentType: 'message/rfc822' });
      const answer = await route.invoke(queueEvent(keys, '', Date.UTC(2026, 2, 2), Math.random));
      expect(answer).toEqual({ kind: 'response', value: { batchItemFailures: [] } });
      for (const key of keys) {
        expect((await store.head(key))?.metadata['tallypost-decision']).toBe('held');
        await store.delete(key);
      }
      console.log(`route function on ${count} mail(s) of 40 MB: peak ${route.peakMb().toFixed(0)} MB`);
      expect(route.peakMb()).toBeGreaterThan(30);
      expect(route.peakMb()).toBeLessThan(256);
    },
    300_000,
  );
});
