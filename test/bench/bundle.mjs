// Bundles TypeScript entries of the benches, so that they run without a TypeScript runner.
import { build } from 'esbuild';

/** Project root, with a slash at its end. */
export const root = new URL('../..', import.meta.url).pathname;

/** Each entry (a path from the root) becomes `<its name>.mjs` in `folder`. */
export function bundleEntries(entryPoints, folder) {
  return build({
    absWorkingDir: root,
    entryPoints,
    outdir: folder,
    entryNames: '[name]',
    outExtension: { '.js': '.mjs' },
    bundle: true,
    platform: 'node',
    format: 'esm',
    mainFields: ['module', 'main'],
    banner: { js: `import { createRequire as __r } from 'node:module'; const require = __r(import.meta.url);` },
    logLevel: 'warning',
  });
}

/** Prints rows under their heads; the first column is text, the others stand right. */
export function printTable(heads, rows) {
  const table = [heads, ...rows].map((row) => row.map(String));
  const widths = heads.map((_, column) => Math.max(...table.map((row) => row[column].length)));
  for (const [name, ...others] of table)
    console.log(
      [name.padEnd(widths[0]), ...others.map((cell, at) => cell.padStart(widths[at + 1]))].join('  '),
    );
}
