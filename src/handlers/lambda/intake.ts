import { createIntakeHandler } from '../intake.ts';
import { createIntakeDeskLoader } from '../intake-desk.ts';
import type { UrlEvent } from '../url-event.ts';
import { handlerFrom } from './environment.ts';

/** TALLYPOST_WEBHOOK_SECRETS: secrets of the helpdesk's webhooks; may be empty. */
export const handler = handlerFrom(({ world, log, loadDesk }) => {
  const loadIntake = createIntakeDeskLoader(loadDesk, process.env.TALLYPOST_WEBHOOK_SECRETS);
  const handle = createIntakeHandler({ world, log, loadDesk: loadIntake });
  return (event) => handle(event as UrlEvent);
});
