// Speed, side by side in one run: medians and ratios.
//   node test/bench/speed/run.mjs [--sections route,scoring,queues,compaction,recount] [--rounds N]
//     [--confirmations 1000,10000] [--queues 10] [--messages short|ordinary]
// Without flags it takes about two minutes; compaction and recount of 1,000,000 confirmations take ten.
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
    confirmations: { type: 'string', default: '1000,10000' },
    queues: { type: 'string', default: '10' },
    messages: { type: 'string', default: 'short' },
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
    if (section === 'compaction' || section === 'recount') await atSizes(section);
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

/** Compaction or recount at each size and number of queues, in processes of their own. The engine's heap is held to 1 GB; what stands
 *  beside it (bytes of bases) is seen in the peak. */
async function atSizes(section) {
  const { growthExponent } = await import(join(folder, 'measure.mjs'));
  const found = [];
  for (const queues of values.queues.split(','))
    for (const size of values.confirmations.split(',')) {
      const store = join(folder, `store-${size}`);
      const child = (step) =>
        JSON.parse(
          execFileSync(
            'node',
            [
              '--max-old-space-size=1024',
              join(folder, 'compaction.mjs'),
              ...[step, store, size, queues, values.messages],
            ],
            { encoding: 'utf8', stdio: ['ignore', 'pipe', 'inherit'] },
          ),
        );
      const counted = child('prepare');
      found.push({ ...child(section), counted, queues });
      rmSync(store, { recursive: true, force: true });
    }
  const tokens = values.messages === 'ordinary' ? 300 : 150;
  console.log(
    `\n${section}: a base and a day's segments; 52 weeks, ${tokens} tokens a message; making the messages left out`,
  );
  const shared = (each) => [
    each.confirmations,
    each.queues,
    each.seconds.toFixed(2),
    each.cpuSeconds.toFixed(2),
    each.peakMb.toFixed(0),
  ];
  const heads = ['confirmations', 'queues', 's', 'CPU s', 'peak MB'];
  if (section === 'recount') printTable(heads, found.map(shared));
  else
    printTable(
      [...heads, 'cells', 'base MB', 'bytes a cell', 'table MB', 'tokens', 'held', 'from nothing: CPU s', 'peak MB'],
      found.map((each) => [
        ...shared(each),
        each.cells,
        (each.baseBytes / 1e6).toFixed(2),
        (each.baseBytes / each.cells).toFixed(2),
        (each.tableBytes / 1e6).toFixed(2),
        each.tokens.counted,
        each.tokens.held,
        each.counted.cpuSeconds.toFixed(2),
        each.counted.peakMb.toFixed(0),
      ]),
    );
  if (new Set(found.map((each) => each.confirmations)).size < 2) return;
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
      `growth exponent over ${name}: CPU ${exponent((e) => e.cpuSeconds)}, memory ${exponent((e) => e.peakMb)}, from nothing CPU ${exponent((e) => e.counted.cpuSeconds)}`,
    );
  }
}
