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
  // Measured by test/bench/speed at 10^4 and 10^3 confirmations of 300 tokens: 8.35 s against 2.48 s of processor time,
  // 368 MB against 200 MB. (8.35 - 2.48) / 9000 = 0.00065 s; (368 - 200) / 9000 = 0.0187 MB.
  compactSeconds: { fixed: 1.8, perConfirmation: 0.00065 },
  compactMb: { fixed: 181, perConfirmation: 0.0187 },
};
