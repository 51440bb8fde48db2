import { createConfirmHandler } from '../confirm.ts';
import { handlerFrom } from './environment.ts';

export const handler = handlerFrom(createConfirmHandler);
