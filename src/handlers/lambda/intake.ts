import { TallypostError } from '../../errors.ts';
import { createIntakeHandler, type UrlEvent } from '../intake.ts';
import { handlerFrom } from './environment.ts';

/** TALLYPOST_WEBHOOK_SECRETS: secrets of the helpdesk's webhooks, newest first, parted by spaces; may be empty. */
export const handler = handlerFrom((deps) => {
  const webhookSecrets = (process.env.TALLYPOST_WEBHOOK_SECRETS ?? '').split(/\s+/).filter(Boolean);
  const handle = createIntakeHandler({
    world: deps.world,
    log: deps.log,
    loadDesk: async () => {
      const desk = await deps.loadDesk();
      if (desk.intake === undefined) {
        throw new TallypostError({
          code: 'intake-not-declared',
          place: 'config/desk.json#/intake',
          expected: 'the intake’s settings',
          got: 'nothing',
        });
      }
      return { settings: desk.intake, queues: new Set(desk.queues.map((queue) => queue.id)), webhookSecrets };
    },
  });
  return (event) => handle(event as UrlEvent);
});
