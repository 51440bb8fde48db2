import { mapBounded } from '../ledger/pace.ts';
import { type BatchHandler, createBatchHandler } from './batch-handler.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { routeObject } from './route-object.ts';
import { createWorkbenchOpener } from './workbench.ts';

/** Routes what arrived: SQS batches of S3 events, or S3 events as they are, for objects under `inbound/`. */
export function createRouteHandler(deps: HandlerDeps): BatchHandler {
  const openWorkbench = createWorkbenchOpener(deps);
  return createBatchHandler(deps, async (objects) => {
    const bench = await openWorkbench();
    return mapBounded(objects, (object) => routeObject(deps, bench, object));
  });
}
