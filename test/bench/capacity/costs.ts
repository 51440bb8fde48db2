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
  // Measured by test/bench/speed at 10,000 and 30,000 confirmations of 300 tokens: 9.56 and 12.50 s of processor time, 393 and
  // 532 MB at the peak. (12.50 - 9.56) / 20,000 = 0.000147 s; (532 - 393) / 20,000 = 0.007 MB. Carried on in a straight line, which
  // overstates: tokens come again, cells grew by the 0.82th power of the confirmations.
  // Assumed besides: 0.1 s for each listing of 1,000 histories.
  compactSeconds: { fixed: 8.1, perConfirmation: 0.000147 + 0.0001 },
  compactMb: { fixed: 323, perConfirmation: 0.007 },
};
