import { execFileSync, spawn } from 'node:child_process';
import { cpSync, mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { build } from 'esbuild';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';

const project = new URL('../..', import.meta.url).pathname;
const root = mkdtempSync(join(tmpdir(), 'tallypost-trial-'));

/** The blocks of the README between opening the intake on this machine and the second run. */
function trialScript(): string {
  const readme = readFileSync(join(project, 'README.md'), 'utf8');
  const from = readme.indexOf('    node dist/cli/tallypost.js init --store trial');
  const to = readme.indexOf('\n\n', readme.lastIndexOf('    node dist/cli/tallypost.js run --store trial'));
  if (from === -1 || to < from) throw new Error('the README has no trial of the intake');
  return readme.slice(from, to).replace(/^ {4}/gm, '');
}

function freePort(): Promise<number> {
  return new Promise((resolve) => {
    const server = createServer();
    server.listen(0, '127.0.0.1', () => {
      const { port } = server.address() as { port: number };
      server.close(() => resolve(port));
    });
  });
}

const tools = ['bash', 'curl', 'openssl', 'od', 'base64'];
const missing = tools.filter((tool) => {
  try {
    execFileSync('sh', ['-c', `command -v ${tool}`], { stdio: 'ignore' });
    return false;
  } catch {
    return true;
  }
});

beforeAll(async () => {
  mkdirSync(join(root, 'dist/cli'), { recursive: true });
  cpSync(join(project, 'events/desk.json'), join(root, 'events/desk.json'));
  writeFileSync(join(root, 'package.json'), '{"type":"module"}');
  await build({
    absWorkingDir: project,
    entryPoints: ['src/cli/tallypost.ts'],
    outfile: join(root, 'dist/cli/tallypost.js'),
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
afterAll(() => rmSync(root, { recursive: true, force: true }));

describe('the README’s form and confirmation', () => {
  if (missing.length > 0)
    process.stdout.write(`left out: the README’s trial of the intake (no ${missing.join(', ')})\n`);
  else
    it('are stored, routed and folded by the lines as they stand there', async () => {
      const port = await freePort();
      const script = [
        // As typed by hand: the server has started before the next line; it ends with the script.
        'set -e',
        "trap 'kill %1' EXIT",
        trialScript()
          .replaceAll('8787', String(port))
          .replace(/ &\n/, ' &\nuntil curl -s -o /dev/null $URL http://127.0.0.1:PORT/; do sleep 0.2; done\n')
          .replaceAll('PORT', String(port)),
      ].join('\n');
      const child = spawn('bash', ['-c', script], { cwd: root, stdio: ['ignore', 'pipe', 'pipe'] });
      let out = '';
      let err = '';
      child.stdout.on('data', (chunk) => {
        out += chunk;
      });
      child.stderr.on('data', (chunk) => {
        err += chunk;
      });
      const code = await new Promise((resolve) => child.on('close', resolve));
      expect([code, err.split('\n').filter((line) => !line.startsWith('{'))]).toEqual([0, ['']]);
      expect(out).toContain(`http://127.0.0.1:${port}/forms/contact`);
      expect(out).toContain('1 held');
      expect(out).toMatch(/"message":"forms\/contact\/[^"]+\.json","taken":"now"/);
      expect(out).toContain('1 confirmed');
    }, 120_000);
});
