import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';

/** What links to the deployed page are signed with, from a setting. Throws TallypostError `settle-secret-unusable`. */
export function readSettleSecret(setting: string | undefined): Uint8Array {
  const secret = (setting ?? '').trim();
  if (secret.length >= bounds.settleSecretCharsMin) return Buffer.from(secret, 'utf8');
  throw new TallypostError({
    code: 'settle-secret-unusable',
    place: 'TALLYPOST_SETTLE_SECRET',
    expected: `at least ${bounds.settleSecretCharsMin} characters`,
    got: secret === '' ? 'nothing' : `${secret.length} characters`,
  });
}
