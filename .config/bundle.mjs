// Bundles the command line and the Lambda functions: one self-contained ES module each.
//   node .config/bundle.mjs               everything, into dist/
//   node .config/bundle.mjs --functions   only the functions, with a table of their sizes
//   ... --only=NAME                       of them one
//   ... --into=FOLDER                     instead of dist/
import { existsSync, mkdirSync, readdirSync, rmSync } from 'node:fs';
import { join, relative, resolve } from 'node:path';
import { pathToFileURL } from 'node:url';
import { build } from 'esbuild';

const root = new URL('..', import.meta.url).pathname;
const into = resolve(
  process.argv.find((word) => word.startsWith('--into='))?.slice('--into='.length) ?? join(root, 'dist'),
);

/** Lambda functions by name: dist/functions/<name>/index.mjs, the folder that the template names. */
export const functions = ['route', 'confirm', 'compact', 'report', 'settle', 'intake', 'backfill'];

const entries = {
  'cli/tallypost': 'src/cli/tallypost.ts',
  // What `tallypost demo` plays: data beside the command line, no part of it.
  'demo/scenario': 'test/scenario/scenario.ts',
  'demo/desk': 'test/scenario/desk.ts',
};

// CommonJS dependencies call require(); an ES module has none of its own.
const require =
  "import { createRequire as __createRequire } from 'node:module'; const require = __createRequire(import.meta.url);";

/** Options of one bundle; `from` is relative to the project's root. */
export const optionsOf = (from, outfile) => ({
  absWorkingDir: root,
  entryPoints: [from],
  outfile,
  bundle: true,
  platform: 'node',
  format: 'esm',
  target: 'node20',
  // ES modules where a package has them: CommonJS copies cannot be shaken, and would be 160 KB more.
  mainFields: ['module', 'main'],
  legalComments: 'none',
  banner: { js: require },
  logLevel: 'warning',
});

async function bundleFunction(name) {
  const folder = join(into, 'functions', name);
  mkdirSync(folder, { recursive: true });
  for (const left of readdirSync(folder))
    if (left !== 'index.mjs') rmSync(join(folder, left), { recursive: true });
  const { metafile } = await build({
    ...optionsOf(`src/handlers/lambda/${name}.ts`, join(folder, 'index.mjs')),
    minify: true,
    metafile: true,
  });
  const [output] = Object.values(metafile.outputs);
  return { name, bytes: output.bytes, packages: packagesOf(output.inputs) };
}

/** Bytes that each package, or folder of ours, adds to a bundle; largest first. */
function packagesOf(inputs) {
  const sums = new Map();
  for (const [path, { bytesInOutput }] of Object.entries(inputs)) {
    const [, found] = /.*node_modules\/((?:@[^/]+\/)?[^/]+)/.exec(path) ?? [];
    const name = found ?? path.split('/').slice(0, 2).join('/');
    sums.set(name, (sums.get(name) ?? 0) + bytesInOutput);
  }
  return [...sums].sort((a, b) => b[1] - a[1]);
}

async function bundleTool(out, from) {
  if (!existsSync(root + from)) return;
  const options = optionsOf(from, join(into, `${out}.js`));
  const shebang = out.startsWith('cli/') ? '#!/usr/bin/env node\n' : '';
  await build({ ...options, banner: { js: shebang + require } });
}

if (import.meta.url === pathToFileURL(process.argv[1]).href) {
  const isFunctionsOnly = process.argv.includes('--functions');
  const only = process.argv.find((word) => word.startsWith('--only='))?.slice('--only='.length);
  const [sizes] = await Promise.all([
    Promise.all(functions.filter((name) => only === undefined || name === only).map(bundleFunction)),
    ...(isFunctionsOnly ? [] : Object.entries(entries).map(([out, from]) => bundleTool(out, from))),
  ]);
  if (isFunctionsOnly) {
    for (const { name, bytes, packages } of sizes) {
      const most = packages.slice(0, 5).map(([what, b]) => `${what} ${Math.round(b / 1000)}`);
      console.log(
        `${join(relative(root, into), 'functions', name).padEnd(24)} ${String(Math.round(bytes / 1000)).padStart(5)} KB   ${most.join(', ')}`,
      );
    }
    console.log('Next: sam deploy --guided');
  }
}
