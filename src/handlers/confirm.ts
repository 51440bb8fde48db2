import { type BatchHandler, createBatchHandler } from './batch-handler.ts';
import { foldDrops } from './fold-drops.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { createDeskOpener } from './workbench.ts';

/** Folds what was confirmed: SQS batches of S3 events, or S3 events as they are, for drops under `confirmations/`. */
export function createConfirmHandler(deps: HandlerDeps): BatchHandler {
  const openDesk = createDeskOpener(deps);
  return createBatchHandler(deps, async (objects) => foldDrops(deps, await openDesk(), objects));
}
