// Speed, side by side in one run: medians and ratios.
//   node test/bench/speed/run.mjs [--sections route,scoring,queues,compaction] [--rounds N] [--confirmations N]
// Without flags it takes about two minutes. --confirmations (default 10000) is the largest compaction: 1000, 10000 … and it.
import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { bundleEntries, printTable } from '../bundle.mjs';

const { values } = parseArgs({
  options: {
    sections: { type: 'string', default: 'route,scoring,queues,compaction' },
    rounds: { type: 'string', default: '11' },
    confirmations: { type: 'string', default: '10000' },
  },
});
const rounds = Number(values.rounds);
const folder = mkdtempSync(join(tmpdir(), 'tallypost-speed-'));
try {
  const entries = ['sections', 'measure', 'compaction'].map((name) => `test/bench/speed/${name}.ts`);
  await bundleEntries(entries, folder);
  const { routeSection, scoringSection, queuesSection } = await import(join(folder, 'sections.mjs'));
  const measured = { route: routeSection, scoring: scoringSection, queues: queuesSection };
  for (const section of values.sections.split(',')) {
    if (section === 'compaction') await compaction();
    else if (section in measured) print(section, await measured[section](rounds));
    else throw new Error(`no section ${section}`);
  }
} finally {
  rmSync(folder, { recursive: true, force: true });
}

function print(section, rows) {
  const ms = (value) => (value < 0.1 ? value.toFixed(4) : value < 10 ? value.toFixed(3) : value.toFixed(1));
  console.log(`\n${section}: processor time, median of ${rounds} rounds`);
  printTable(
    ['what', 'ms', 'ratio', 'note'],
    rows.map((row) => [row.what, ms(row.ms), row.ratio === null ? '-' : row.ratio.toFixed(2), row.note]),
  );
}

/** Each size in processes of its own. */
async function compaction() {
  const { growthExponent } = await import(join(folder, 'measure.mjs'));
  const largest = Number(values.confirmations);
  const sizes = [];
  for (let size = 1000; size < largest; size *= 10) sizes.push(size);
  sizes.push(largest);
  const found = sizes.map((size) => {
    const store = join(folder, `store-${size}`);
    const child = (step) =>
      execFileSync(
        'node',
        ['--max-old-space-size=4096', join(folder, 'compaction.mjs'), step, store, String(size)],
        { encoding: 'utf8', stdio: ['ignore', 'pipe', 'inherit'] },
      );
    child('prepare');
    const result = JSON.parse(child('compact'));
    rmSync(store, { recursive: true, force: true });
    return result;
  });
  console.log('\ncompaction: a twentieth waits in segments; 10 queues, 52 weeks, 300 tokens a message');
  printTable(
    ['confirmations', 's', 'CPU s', 'peak MB', 'cells', 'base MB', 'bytes a cell', 'table MB', 'fitted to'],
    found.map((each) => [
      each.confirmations,
      each.seconds.toFixed(2),
      each.cpuSeconds.toFixed(2),
      each.peakMb.toFixed(0),
      each.cells,
      (each.baseBytes / 1e6).toFixed(2),
      (each.baseBytes / each.cells).toFixed(2),
      (each.tableBytes / 1e6).toFixed(2),
      each.fitted,
    ]),
  );
  if (found.length < 2) return;
  for (const [name, some] of [
    ['all sizes', found],
    ['the two largest', found.slice(-2)],
  ]) {
    const exponent = (of) =>
      growthExponent(
        some.map((each) => each.confirmations),
        some.map(of),
      ).toFixed(2);
    console.log(
      `growth exponent over ${name}: CPU ${exponent((e) => e.cpuSeconds)}, memory ${exponent((e) => e.peakMb)}, base ${exponent((e) => e.baseBytes)}`,
    );
  }
}
