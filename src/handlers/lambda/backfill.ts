import { type BatchJobEvent, createBackfillHandler } from '../backfill.ts';
import { handlerFrom } from './environment.ts';

export const handler = handlerFrom((deps) => {
  const handle = createBackfillHandler(deps);
  return (event) => handle(event as BatchJobEvent);
});
