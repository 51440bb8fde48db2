import { createReportHandler } from '../report.ts';
import { handlerFrom } from './environment.ts';

export const handler = handlerFrom(createReportHandler);
