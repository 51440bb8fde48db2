import type { Desk } from '../desk/desk.ts';
import { TallypostError } from '../errors.ts';
import type { IntakeDesk } from '../intake/answer.ts';
import { keys } from '../store/keys.ts';

/** What the intake needs of a desk. `secrets`: those of the helpdesk's webhooks, newest first, parted by white space; none:
 *  confirmations are not taken. Rejects as `loadDesk` does, and with TallypostError `intake-not-declared`. */
export function createIntakeDeskLoader(
  loadDesk: () => Promise<Desk>,
  secrets: string | undefined,
): () => Promise<IntakeDesk> {
  const webhookSecrets = (secrets ?? '').split(/\s+/).filter(Boolean);
  return async () => {
    const { intake, queues } = await loadDesk();
    if (intake === undefined) {
      throw new TallypostError({
        code: 'intake-not-declared',
        place: `${keys.desk}#/intake`,
        expected: 'the intake’s settings',
        got: 'nothing',
      });
    }
    return { settings: intake, queues: new Set(queues.map((queue) => queue.id)), webhookSecrets };
  };
}
