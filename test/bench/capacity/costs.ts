import { machineOfTemplate, ordinaryLoad } from '../../../src/cost/load.ts';
import type { Costs, Traffic } from './capacity.ts';

/** Assumed: as the cost model has it; a peak of ten times the mean. */
export const traffic: Omit<Traffic, 'messagesPerMonth'> = {
  confirmedShare: ordinaryLoad.confirmedShare,
  peakFactor: 10,
  historyMonths: ordinaryLoad.historyMonths,
};

export const costs: Costs = {
  // Assumed with room, as the cost model has them.
  routeSeconds: machineOfTemplate.routeMs / 1000,
  confirmSeconds: machineOfTemplate.confirmMs / 1000,
  intakeSeconds: machineOfTemplate.intakeMs / 1000,
  confirmBatch: machineOfTemplate.confirmBatchMax,
  // Assumed: two requests of 30 ms; half of the turns are lost to each other.
  commitSeconds: 0.06,
  commitShare: 0.5,
  // Measured by test/bench/speed at 100,000 and 1,000,000 confirmations of 150 tokens, a day of them in segments: 16.3 and 55.5 s
  // of processor time, 231 and 346 MB at the peak. (55.5 - 16.3) / 900,000 = 0.0000436 s; (346 - 231) / 900,000 = 0.000128 MB.
  // Carried on in a straight line, which overstates: tokens come again, cells grew by the 0.82th power of the confirmations.
  // Assumed besides: 0.1 s for each listing of 1,000 histories.
  compactSeconds: { fixed: 11.9, perConfirmation: 0.0000436 + 0.0001 },
  compactMb: { fixed: 218, perConfirmation: 0.000128 },
};
