import { readSettleSecret } from '../../settle/secret.ts';
import { createSettleHandler } from '../settle.ts';
import { handlerFrom } from './environment.ts';

/** TALLYPOST_SETTLE_SECRET: what links are signed with. */
export const handler = handlerFrom((deps) =>
  createSettleHandler(deps, readSettleSecret(process.env.TALLYPOST_SETTLE_SECRET)),
);
