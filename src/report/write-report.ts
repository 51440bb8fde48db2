import type { Desk } from '../desk/desk.ts';
import type { Extractor } from '../features/extractor.ts';
import type { World } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import { type CollectOptions, collectReport } from './collect.ts';
import type { ReportData } from './report-data.ts';
import { reportPage } from './report-page.ts';

export interface WrittenReport {
  readonly data: ReportData;
  /** Keys of the page and of its numbers, under the day; the newest also lies under `reports/latest`. */
  readonly page: string;
  readonly numbers: string;
  readonly pageBytes: number;
}

/** Makes the report of now and writes it, page and numbers, under its day (UTC) and as the latest. */
export async function writeReport(
  world: World,
  desk: Desk,
  extractor: Extractor,
  options: CollectOptions,
): Promise<WrittenReport> {
  const data = await collectReport(world, desk, extractor, options);
  const page = Buffer.from(reportPage(data));
  const numbers = Buffer.from(`${JSON.stringify(data, null, 1)}\n`);
  const name = keys.reports + data.madeAt.slice(0, 10);
  for (const stem of [name, `${keys.reports}latest`]) {
    await world.store.put(`${stem}.html`, page, { contentType: 'text/html; charset=utf-8' });
    await world.store.put(`${stem}.json`, numbers, { contentType: 'application/json' });
  }
  return { data, page: `${name}.html`, numbers: `${name}.json`, pageBytes: page.length };
}
