import { bounds } from '../bounds.ts';
import { measureReport } from '../metrics/measurement.ts';
import { writeReport } from '../report/write-report.ts';
import type { ObjectHead } from '../store/store.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { readMessage } from './read-message.ts';
import { createDeskOpener } from './workbench.ts';

export interface ReportResult {
  readonly page: string;
  readonly numbers: string;
  readonly pageBytes: number;
}

/** Whether a message is opened for its words. */
export function isOpened({ bytes }: Pick<ObjectHead, 'bytes'>): boolean {
  return bytes <= bounds.reportReadBytesMax;
}

/** Writes the report of now, whatever the event: made for a schedule after the compaction's. A function of its own, since
 *  it alone draws. Throws what stopped it, so that the schedule's retries and alarms see it. */
export function createReportHandler(deps: HandlerDeps): (event: unknown) => Promise<ReportResult> {
  const openDesk = createDeskOpener(deps);
  return async () => {
    const startedMs = deps.world.nowMs();
    try {
      const { desk, extractor } = await openDesk();
      const { page, numbers, pageBytes } = await writeReport(deps.world, desk, extractor, {
        readMessage: async (key) => (await readMessage(deps.world, key, isOpened))?.message ?? null,
      });
      const result = { page, numbers, pageBytes };
      deps.measure?.(measureReport());
      deps.log({ level: 'info', event: 'report', tookMs: deps.world.nowMs() - startedMs, ...result });
      return result;
    } catch (error) {
      deps.log({ level: 'error', event: 'report-failed', ...faultMembers(error) });
      throw error;
    }
  };
}
