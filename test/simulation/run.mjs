// Runs the simulation over many seeds: node test/simulation/run.mjs --seeds N [--from S] [--trace]
// Bundles it first, so that no TypeScript runner is needed. The first seed that fails is printed with what went wrong.
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import { parseArgs } from 'node:util';
import { build } from 'esbuild';

const { values } = parseArgs({
  options: {
    seeds: { type: 'string', default: '2000' }, from: { type: 'string', default: '1' },
    trace: { type: 'boolean', default: false },
  },
});
const from = Number(values.from);
const until = from + Number(values.seeds);
if (!Number.isSafeInteger(from) || !Number.isSafeInteger(until)) throw new Error('--seeds and --from take whole numbers');

const folder = mkdtempSync(join(tmpdir(), 'simulation-'));
try {
  const outfile = join(folder, 'simulation.mjs');
  await build({
    entryPoints: [new URL('simulation.ts', import.meta.url).pathname],
    outfile,
    bundle: true,
    platform: 'node',
    format: 'esm',
    logLevel: 'warning',
    banner: { js: "import { createRequire as __r } from 'node:module'; const require = __r(import.meta.url);" },
  });
  const { Simulation } = await import(pathToFileURL(outfile).href);
  const sum = { steps: 0, faults: 0, crashes: 0, versions: 0 };
  const startedAt = performance.now();
  const usedBefore = process.cpuUsage();
  for (let seed = from; seed < until; seed++) {
    try {
      const simulation = new Simulation(seed);
      if (values.trace) simulation.scheduler.trace = console.log;
      const summary = await simulation.run();
      for (const name of Object.keys(sum)) sum[name] += summary[name];
    } catch (error) {
      console.error(`seed ${seed} fails: ${error?.stack ?? error}`);
      console.error(`again: npm run simulate -- --seeds 1 --from ${seed}`);
      process.exitCode = 1;
      break;
    }
    if ((seed - from + 1) % 1000 === 0) report(seed);
  }
  report(until - 1);
  function report(seed) {
    const seconds = Math.round((performance.now() - startedAt) / 100) / 10;
    console.log(`seeds ${from} to ${seed}: ${seconds} s (${Math.round(process.cpuUsage(usedBefore).user / 1e5) / 10} s of processor), ${JSON.stringify(sum)}`);
  }
} finally {
  rmSync(folder, { recursive: true, force: true });
}
