// Where limits are met: a computation from measured and assumed costs (costs.ts).
//   node test/bench/capacity/run.mjs [--messages N]      (default 100000000 a month)
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { bundleEntries, printTable } from '../bundle.mjs';

const { values } = parseArgs({ options: { messages: { type: 'string', default: '100000000' } } });
const folder = mkdtempSync(join(tmpdir(), 'tallypost-capacity-'));
try {
  await bundleEntries(['test/bench/capacity/print.ts'], folder);
  const { capacityRows, capacitySummary } = await import(join(folder, 'print.mjs'));
  printTable(['limit', 'maximum', `needed by ${values.messages} a month`, 'met at, a month'], capacityRows(Number(values.messages)));
  console.log(capacitySummary());
} finally {
  rmSync(folder, { recursive: true, force: true });
}
