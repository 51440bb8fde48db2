import { createRouteHandler } from '../route.ts';
import { handlerFrom } from './environment.ts';

export const handler = handlerFrom(createRouteHandler);
