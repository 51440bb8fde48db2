// What one desk of several languages loses against a desk for each, on the scenario's letters; ends with 1 when that is more
// than 2 points for any language.
//   node test/bench/languages/run.mjs [--seeds 1,2,3] [--messages 6000]
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { bundleEntries, printTable } from '../bundle.mjs';

const { values } = parseArgs({
  options: { seeds: { type: 'string', default: '1,2,3' }, messages: { type: 'string', default: '6000' } },
});
const lostPointsMax = 2;
const folder = mkdtempSync(join(tmpdir(), 'tallypost-languages-'));
try {
  await bundleEntries(['test/bench/languages/languages.ts'], folder);
  const { compareDesks } = await import(join(folder, 'languages.mjs'));
  const sums = new Map();
  for (const seed of values.seeds.split(',')) {
    for (const row of await compareDesks(Number(seed), Number(values.messages))) {
      for (const name of [row.language, 'all']) {
        const sum = sums.get(name) ?? { learned: 0, scored: 0, rightAlone: 0, rightMixed: 0 };
        for (const part of Object.keys(sum)) sum[part] += row[part];
        sums.set(name, sum);
      }
    }
  }
  const percent = (right, { scored }) => ((100 * right) / scored).toFixed(2);
  const lost = (sum) => (100 * (sum.rightAlone - sum.rightMixed)) / sum.scored;
  const rows = [...sums].sort(([a], [b]) => (a === 'all') - (b === 'all'));
  printTable(
    ['letters', 'learned', 'scored', '% right, a desk each', '% right, one desk', 'points lost'],
    rows.map(([name, sum]) => [
      name,
      sum.learned,
      sum.scored,
      percent(sum.rightAlone, sum),
      percent(sum.rightMixed, sum),
      lost(sum).toFixed(2),
    ]),
  );
  if (rows.some(([, sum]) => lost(sum) > lostPointsMax)) {
    console.log(`more than ${lostPointsMax} points lost`);
    process.exitCode = 1;
  }
} finally {
  rmSync(folder, { recursive: true, force: true });
}
