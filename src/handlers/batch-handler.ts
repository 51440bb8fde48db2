import { TallypostError } from '../errors.ts';
import { deliveriesOf, type EventObject } from './event-objects.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';

/** What Lambda's SQS source expects with ReportBatchItemFailures: what is not named is done with. */
export interface BatchResult {
  readonly batchItemFailures: readonly { readonly itemIdentifier: string }[];
}

export type BatchHandler = (event: unknown) => Promise<BatchResult>;

/** Feeds the objects of all deliveries of an event to `work`, which answers for each, in order, whether it is done with. A
 *  delivery with an object that is not is named as failed, and so comes again; the others do not.
 *  A direct S3 event has no such answer: the handler throws TallypostError `delivery-failed`, and Lambda tries again. */
export function createBatchHandler(
  deps: HandlerDeps,
  work: (objects: readonly EventObject[]) => Promise<readonly boolean[]>,
): BatchHandler {
  return async (event) => {
    const deliveries = deliveriesOf(event, deps.prefix ?? '');
    const objects = deliveries.flatMap((delivery) => delivery.objects);
    let areDone: readonly boolean[] = [];
    try {
      if (objects.length > 0) areDone = await work(objects);
    } catch (error) {
      // What every object needs is missing, such as a desk's file that can be read: all of them come again.
      deps.log({ level: 'error', event: 'batch-failed', objects: objects.length, ...faultMembers(error) });
    }
    const failures = objects.filter((_, i) => areDone[i] !== true).length;
    deps.measure?.([{ queue: null, values: { Failed: [failures] } }]);
    let next = 0;
    const failed = deliveries.filter(({ receipt, objects: own, fault }) => {
      if (fault !== null)
        deps.log({ level: 'error', event: 'event-refused', delivery: receipt, ...faultMembers(fault) });
      const isDone = fault === null && own.every((_, i) => areDone[next + i] === true);
      next += own.length;
      return !isDone;
    });
    if (failed.some((delivery) => delivery.receipt === null)) {
      throw new TallypostError({
        code: 'delivery-failed',
        place: 'event',
        expected: 'every object done',
        got: 'some to be tried again',
      });
    }
    return { batchItemFailures: failed.map(({ receipt }) => ({ itemIdentifier: receipt! })) };
  };
}
