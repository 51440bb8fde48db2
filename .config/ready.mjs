// Makes a fresh clone ready: installs the locked packages when they are not there, then builds, all or what the arguments say.
import { execFileSync } from 'node:child_process';
import { existsSync, statSync } from 'node:fs';

const root = new URL('..', import.meta.url).pathname;
const run = (command, ...args) =>
  execFileSync(command, args, { cwd: root, stdio: 'inherit', shell: process.platform === 'win32' });

const installed = `${root}node_modules/.package-lock.json`;
if (!existsSync(installed) || statSync(installed).mtimeMs < statSync(`${root}package-lock.json`).mtimeMs) {
  run('npm', 'ci', '--no-audit', '--no-fund');
}
run('node', '.config/bundle.mjs', ...process.argv.slice(2));
