import { spawn } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createInterface } from 'node:readline';
import { build } from 'esbuild';

/** Silence after which the process is taken to hang: far above the deadline, whatever else the machine does. */
const silenceMsMax = 180_000;

export interface Report<Result> {
  readonly results: ReadonlyMap<string, Result>;
  /** The input that was being worked on when the process ended or was stopped too early; null when all were. */
  readonly stuckAt: string | null;
}

/** Runs a module of this folder in a process of its own, so that time and memory are those of the work alone. It says
 *  `{"starting": name}` before each input and a result, with its name, after it. */
export async function runInChild<Result extends { readonly name: string }>(
  module: string,
): Promise<Report<Result>> {
  const folder = mkdtempSync(join(tmpdir(), 'tallypost-hostile-'));
  try {
    const bundle = join(folder, 'run.mjs');
    await build({
      entryPoints: [new URL(module, import.meta.url).pathname],
      outfile: bundle,
      bundle: true,
      platform: 'node',
      format: 'esm',
      mainFields: ['module', 'main'],
      banner: {
        js: "import { createRequire as __c } from 'node:module'; const require = __c(import.meta.url);",
      },
      logLevel: 'error',
    });
    return await follow(bundle);
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

async function follow<Result extends { readonly name: string }>(bundle: string): Promise<Report<Result>> {
  const child = spawn(process.execPath, [bundle], { stdio: ['ignore', 'pipe', 'inherit'] });
  const results = new Map<string, Result>();
  let current: string | null = null;
  let watch = setTimeout(() => child.kill('SIGKILL'), silenceMsMax);
  for await (const line of createInterface({ input: child.stdout })) {
    clearTimeout(watch);
    watch = setTimeout(() => child.kill('SIGKILL'), silenceMsMax);
    const said = JSON.parse(line) as Result | { starting: string };
    if ('starting' in said) current = said.starting;
    else {
      results.set(said.name, said);
      current = null;
    }
  }
  clearTimeout(watch);
  return { results, stuckAt: current };
}
