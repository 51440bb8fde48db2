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
  readonly tasks: readonly { readonly taskId: string; readonly s3Key: string }[];
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

/** Labelled mail under `inbound/archive/<queue>/…` is learned: for each object a confirmation is dropped, which the
 *  confirm function folds in batches. The drop's name is made from the key, and its content from the message, so that a
 *  repeated, resumed or second job drops the same, and folding that again changes nothing: exactly once.
 *  The queue is the job's argument `queue`, else the folder. */
export function createBackfillHandler(deps: HandlerDeps): (event: BatchJobEvent) => Promise<BatchJobResult> {
  return async (event) => {
    const desk = await deps.loadDesk();
    const queues = new Set(desk.queues.map((queue) => queue.id));
    const results = [];
    for (const task of event.tasks) {
      let result: TaskResult;
      try {
        result = await learnTask(deps, queues, task, event.job.userArguments?.queue);
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

async function learnTask(
  deps: HandlerDeps,
  queues: ReadonlySet<string>,
  task: Task,
  given?: string,
): Promise<TaskResult> {
  const key = keyOf(task, deps.prefix ?? '');
  if (key === null) return refused(`expected a key under ${keys.archive}`);
  const queue = given ?? key.slice(keys.archive.length).split('/', 1)[0]!;
  if (!queues.has(queue)) return refused('expected a queue of the desk as folder or as the argument `queue`');
  const found = await readMessage(deps.world, key, () => true);
  if (found?.message == null) return refused('expected an object');
  if (found.parserError !== null) return refused('expected mail or a form that can be parsed');
  const atMs = Math.min(found.message.sentAtMs ?? found.head.modifiedAtMs, found.head.modifiedAtMs);
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

/** Keys arrive form-encoded, as in S3's events. Null: not of this desk's archive. */
function keyOf(task: Task, prefix: string): string | null {
  let key: string;
  try {
    key = decodeURIComponent(task.s3Key.replaceAll('+', ' '));
  } catch {
    return null;
  }
  if (prefix !== '') {
    if (!key.startsWith(`${prefix}/`)) return null;
    key = key.slice(prefix.length + 1);
  }
  return key.startsWith(keys.archive) ? key : null;
}

function refused(why: string): TaskResult {
  return { resultCode: 'PermanentFailure', resultString: why };
}
