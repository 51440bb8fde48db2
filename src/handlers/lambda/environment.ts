import { randomInt } from 'node:crypto';
import { S3Client } from '@aws-sdk/client-s3';
import { TallypostError } from '../../errors.ts';
import type { World } from '../../ledger/world.ts';
import { documentsOf } from '../../metrics/emf.ts';
import type { Measurement } from '../../metrics/measurement.ts';
import { createS3Store } from '../../store/s3.ts';
import type { HandlerDeps, LogLine } from '../handler-deps.ts';
import { createDeskLoader } from '../load-desk.ts';
import { loadTokenKey } from '../load-token-key.ts';

/** A handler made from the function's environment on its first invocation, and kept for the next ones with its client, desk
 *  and model. Settings: TALLYPOST_BUCKET; TALLYPOST_PREFIX and TALLYPOST_TOKEN_KEY may be left out;
 *  TALLYPOST_MARK_WAITING says `yes` where the page for held messages is deployed. */
export function handlerFrom<R>(
  create: (deps: HandlerDeps) => (event: unknown) => Promise<R>,
): (event: unknown) => Promise<R> {
  const prefix = (process.env.TALLYPOST_PREFIX ?? '').replace(/^\/+|\/+$/g, '');
  const store = createS3Store({ client: new S3Client({}), bucket: setting('TALLYPOST_BUCKET'), prefix });
  const world: World = {
    store,
    nowMs: Date.now,
    // Ids are drawn from it: two functions that start alike must not draw alike.
    random: () => randomInt(2 ** 31) / 2 ** 31,
    sleep: (ms) => new Promise((resolve) => setTimeout(resolve, ms)),
  };
  const loadDesk = createDeskLoader(world);
  const desk = prefix === '' ? setting('TALLYPOST_BUCKET') : `${setting('TALLYPOST_BUCKET')}/${prefix}`;
  const measured: Measurement[] = [];
  const measure = (more: readonly Measurement[]) => void measured.push(...more);
  let handler: ((event: unknown) => Promise<R>) | null = null;
  return async (event) => {
    // Not kept when it fails: a key that is put there later is found by the next invocation.
    if (handler === null) {
      const tokenKey = await loadTokenKey(store, process.env.TALLYPOST_TOKEN_KEY, null);
      handler = create({
        world,
        loadDesk,
        tokenKey,
        log: writeLine,
        measure,
        prefix,
        isMarkingWaiting: process.env.TALLYPOST_MARK_WAITING === 'yes',
      });
    }
    try {
      return await handler(event);
    } finally {
      for (const document of documentsOf(measured.splice(0), desk, Date.now())) write(document);
    }
  };
}

function writeLine(line: LogLine): void {
  write({ time: new Date().toISOString(), ...line });
}

/** One line of JSON to the function's log. Not by the console: Lambda would wrap it, and metrics must stand at the root. */
function write(line: object): void {
  process.stdout.write(`${JSON.stringify(line)}\n`);
}

function setting(name: string): string {
  const value = process.env[name];
  if (value) return value;
  throw new TallypostError({
    code: 'setting-missing',
    place: name,
    expected: 'an environment variable',
    got: 'nothing',
  });
}
