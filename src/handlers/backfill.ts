import { createHash } from 'node:crypto';
import type { Confirmation } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { readMessage } from './read-message.ts';

/** An invocation by S3 Batch Operations, schema 1.0 or 2.0: the members that are read.
 *  Source: Amazon S3 User Guide, "Invoke AWS Lambda function". */
export interface BatchJobEvent {
  readonly invocationSchemaVersion: string;
  readonly invocationId: string;
  readonly job: { readonly id: string; readonly userArguments?: Readonly<Record<string, string>> | null };
  readonly tasks: readonly {
    readonly taskId: string;
    readonly s3Key: string;
    /** Of schema 1.0. */
    readonly s3BucketArn?: string;
    /** Of schema 2.0, its name. */
    readonly s3Bucket?: string;
  }[];
}

export interface BatchJobResult {
  readonly invocationSchemaVersion: string;
  readonly treatMissingKeysAs: 'PermanentFailure';
  readonly invocationId: string;
  readonly results: readonly {
    readonly taskId: string;
    readonly resultCode: 'Succeeded' | 'TemporaryFailure' | 'PermanentFailure';
    readonly resultString: string;
  }[];
}

type Task = BatchJobEvent['tasks'][number];
type TaskResult = Omit<BatchJobResult['results'][number], 'taskId'>;

const schemas = new Set(['1.0', '2.0']);

/** Labelled mail under `inbound/archive/<queue>/…` is learned: for each object a confirmation is dropped, which the
 *  confirm function folds in batches. The drop's name is made from the key, and its content from the message, so that a
 *  repeated, resumed or second job drops the same, and folding that again changes nothing: exactly once.
 *  The queue is the job's argument `queue`, else the folder. */
export function createBackfillHandler(deps: HandlerDeps): (event: BatchJobEvent) => Promise<BatchJobResult> {
  return async (event) => {
    const isKnown = schemas.has(event.invocationSchemaVersion);
    const results = [];
    for (const task of event.tasks) {
      let result: TaskResult;
      try {
        result = isKnown
          ? await learnTask(deps, task, event.job.userArguments?.queue)
          : refused('expected invocation schema 1.0 or 2.0');
      } catch (error) {
        deps.log({ level: 'error', event: 'backfill-failed', task: task.taskId, ...faultMembers(error) });
        result = { resultCode: 'TemporaryFailure', resultString: 'the store failed; see the log' };
      }
      results.push({ taskId: task.taskId, ...result });
    }
    return {
      invocationSchemaVersion: event.invocationSchemaVersion,
      treatMissingKeysAs: 'PermanentFailure',
      invocationId: event.invocationId,
      results,
    };
  };
}

async function learnTask(deps: HandlerDeps, task: Task, given?: string): Promise<TaskResult> {
  const desk = await deps.loadDesk();
  if (!isOfBucket(task, deps.world.store.place)) return refused('expected a key of this desk’s bucket');
  const keysMeant = keysOf(task, deps.prefix ?? '');
  if (keysMeant.length === 0) return refused(`expected a key under ${keys.archive}`);
  const queueOf = (key: string) => given ?? key.slice(keys.archive.length).split('/', 1)[0]!;
  const known = keysMeant.filter((key) => desk.queues.some(({ id }) => id === queueOf(key)));
  if (known.length === 0) return refused('expected a queue of the desk as folder or as the argument `queue`');
  for (const key of known) {
    const found = await readMessage(deps.world, key, () => true);
    if (found?.message == null) continue;
    if (found.parserError !== null) return refused('expected mail or a form that can be parsed');
    return drop(deps, key, queueOf(key), found.message.sentAtMs, found.head.modifiedAtMs);
  }
  return refused('expected an object');
}

async function drop(
  deps: HandlerDeps,
  key: string,
  queue: string,
  sentAtMs: number | null,
  modifiedAtMs: number,
): Promise<TaskResult> {
  const atMs = Math.min(sentAtMs ?? modifiedAtMs, modifiedAtMs);
  const confirmation: Confirmation = {
    message: key.slice(keys.inbound.length),
    queue,
    by: 'backfill',
    at: new Date(Math.max(0, atMs)).toISOString(),
  };
  const name = createHash('sha256').update(`${key}\n${queue}`).digest('hex');
  await deps.world.store.put(
    `${keys.confirmations}backfill-${name}.json`,
    new TextEncoder().encode(JSON.stringify(confirmation)),
    {
      ifNoneMatch: '*',
      contentType: 'application/json',
    },
  );
  return { resultCode: 'Succeeded', resultString: queue };
}

/** A list of keys may name other buckets, in which the same key is another message. */
function isOfBucket({ s3Bucket, s3BucketArn }: Task, place: string): boolean {
  const bucket = s3Bucket ?? s3BucketArn?.split(':::')[1];
  const [, own] = /^s3:\/\/([^/]+)/.exec(place) ?? [];
  return bucket === undefined || own === undefined || bucket === own;
}

/** Keys arrive as the list has them, encoded: a plus is a space in lists that S3 made, and itself in others, so that both
 *  are looked for. None: not of this desk's archive. */
function keysOf(task: Task, prefix: string): string[] {
  const root = prefix === '' ? '' : `${prefix}/`;
  const texts = new Set([task.s3Key.replaceAll('+', ' '), task.s3Key]);
  return [...texts].flatMap((text) => {
    try {
      const key = decodeURIComponent(text);
      return key.startsWith(root + keys.archive) ? [key.slice(root.length)] : [];
    } catch {
      return [];
    }
  });
}

function refused(why: string): TaskResult {
  return { resultCode: 'PermanentFailure', resultString: why };
}
