import { createCompactHandler } from '../compact.ts';
import { handlerFrom } from './environment.ts';

export const handler = handlerFrom(createCompactHandler);
