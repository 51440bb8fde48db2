import { mapBounded } from '../ledger/pace.ts';
import { measureRouting } from '../metrics/measurement.ts';
import { type BatchHandler, createBatchHandler } from './batch-handler.ts';
import { type HandlerDeps, keepLines } from './handler-deps.ts';
import { routeObject } from './route-object.ts';
import { createWorkbenchOpener } from './workbench.ts';

/** Routes what arrived: SQS batches of S3 events, or S3 events as they are, for objects under `inbound/`. */
export function createRouteHandler(deps: HandlerDeps): BatchHandler {
  const openWorkbench = createWorkbenchOpener(deps);
  return createBatchHandler(deps, async (objects) => {
    const bench = await openWorkbench();
    const kept = keepLines(deps);
    const areDone = await mapBounded(objects, (object) => routeObject(kept.deps, bench, object));
    const queues = bench.desk.queues.map((queue) => queue.id);
    deps.measure?.(measureRouting(kept.lines, queues, bench.segments ?? null));
    return areDone;
  });
}
