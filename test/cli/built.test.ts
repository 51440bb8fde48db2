import { type ChildProcess, spawn } from 'node:child_process';
import { mkdir, mkdtemp, readdir, readFile, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { build } from 'esbuild';
import { afterAll, beforeAll, expect, it } from 'vitest';
import { deskFile, lay, mail } from './run-cli.ts';

/** The command line as it is shipped: bundled, in a process of its own. */
const project = new URL('../..', import.meta.url).pathname;
let root: string;
let script: string;

beforeAll(async () => {
  root = await mkdtemp(join(tmpdir(), 'tallypost-built-'));
  script = join(root, 'dist/cli/tallypost.js');
  await writeFile(join(root, 'package.json'), '{"type":"module"}');
  await build({
    absWorkingDir: project,
    entryPoints: [
      { in: 'src/cli/tallypost.ts', out: 'cli/tallypost' },
      { in: 'test/scenario/scenario.ts', out: 'demo/scenario' },
      { in: 'test/scenario/desk.ts', out: 'demo/desk' },
    ],
    outdir: join(root, 'dist'),
    bundle: true,
    platform: 'node',
    format: 'esm',
    target: 'node20',
    mainFields: ['module', 'main'],
    banner: {
      js: "import { createRequire as __createRequire } from 'node:module'; const require = __createRequire(import.meta.url);",
    },
    logLevel: 'silent',
  });
});
afterAll(() => rm(root, { recursive: true, force: true }));

function start(
  ...args: string[]
): ChildProcess & { readonly done: Promise<{ code: number | null; out: string; err: string }> } {
  const child = spawn(process.execPath, [script, ...args], { cwd: root, stdio: ['ignore', 'pipe', 'pipe'] });
  let [out, err] = ['', ''];
  child.stdout.on('data', (chunk) => {
    out += chunk;
  });
  child.stderr.on('data', (chunk) => {
    err += chunk;
  });
  const done = new Promise<{ code: number | null; out: string; err: string }>((resolve) => {
    child.on('close', (code) => resolve({ code, out, err }));
  });
  return Object.assign(child, { done });
}
const run = (...args: string[]) => start(...args).done;

it('plays a demo into a fresh directory, and again into the same one', { timeout: 300_000 }, async () => {
  const args = ['demo', '--dir', 'play', '--messages', '20'];
  const first = await run(...args, '--json');
  expect(first).toMatchObject({ code: 0, err: '' });
  expect(JSON.parse(first.out)).toMatchObject({ messages: 20, recount: { differences: 0 }, faults: [] });
  expect(await readdir(join(root, 'play'))).toEqual(
    expect.arrayContaining(['config', 'inbound', 'reports', 'demo-summary.json']),
  );
  await writeFile(join(root, 'play/left-from-before'), '');
  const again = await run(...args);
  expect(again).toMatchObject({ code: 0, err: '' });
  expect(again.out).toContain('0 cells differ');
  expect(await readdir(join(root, 'play'))).not.toContain('left-from-before');
  // What it says to type works.
  const command = /explain --store (\S+) (\S+)$/m.exec(again.out)!;
  const explained = await run('explain', '--store', command[1], command[2]);
  expect(explained).toMatchObject({ code: 0, err: '' });
  expect(explained.out).toContain('decibans');
  expect((await run('recount', '--store', 'play')).code).toBe(0);
});

it('leaves a directory alone that no demo made', async () => {
  await mkdir(join(root, 'used'));
  await writeFile(join(root, 'used/letter'), 'dear');
  const { code, err } = await run('demo', '--dir', 'used');
  expect(code).toBe(2);
  expect(err).toContain('directory-in-use');
  expect(await readFile(join(root, 'used/letter'), 'utf8')).toBe('dear');
});

it('follows a store until it is interrupted, and then ends in order', async () => {
  await lay(root, { 'desk/config/desk.json': deskFile, 'desk/inbound/a.eml': mail('Bill', 'my bill') });
  const child = start('run', '--store', 'desk', '--follow', '--every', '0.1', '--json');
  let isInterrupted = false;
  child.stdout!.on('data', () => {
    // The first round has been told.
    if (!isInterrupted) child.kill('SIGINT');
    isInterrupted = true;
  });
  const { code, out } = await child.done;
  expect(code).toBe(0);
  expect(JSON.parse(out.slice(0, out.indexOf('\n')))).toMatchObject({ held: 1 });
  expect(JSON.parse(out.slice(out.indexOf('\n')))).toMatchObject({ kind: 'stopped', held: 1, failed: 0 });
});

it('ends with 2 for wrong usage and with 0 when its reader closes early', async () => {
  expect((await run('fly')).code).toBe(2);
  const child = start('replay', '--help');
  child.stdout!.destroy();
  expect((await child.done).code).toBe(0);
});
