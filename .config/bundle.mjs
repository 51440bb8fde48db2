// Bundles the command line and the Lambda functions: one self-contained ES module each.
import { existsSync, rmSync } from 'node:fs';
import { build } from 'esbuild';

const root = new URL('..', import.meta.url).pathname;
const entries = {
  'cli/tallypost': 'src/cli/tallypost.ts',
  // What `tallypost demo` plays: data beside the command line, no part of it.
  'demo/scenario': 'test/scenario/scenario.ts',
  'demo/desk': 'test/scenario/desk.ts',
  'functions/route/index': 'src/handlers/lambda/route.ts',
  'functions/confirm/index': 'src/handlers/lambda/confirm.ts',
  'functions/compact/index': 'src/handlers/lambda/compact.ts',
  'functions/intake/index': 'src/handlers/lambda/intake.ts',
  'functions/backfill/index': 'src/handlers/lambda/backfill.ts',
};
rmSync(`${root}dist`, { recursive: true, force: true });
for (const [out, from] of Object.entries(entries)) {
  if (!existsSync(root + from)) continue;
  await build({
    absWorkingDir: root,
    entryPoints: [{ in: from, out }],
    outdir: 'dist',
    bundle: true,
    minify: out.startsWith('functions/'),
    platform: 'node',
    format: 'esm',
    target: 'node20',
    mainFields: ['module', 'main'],
    legalComments: 'none',
    // CommonJS dependencies call require(); an ES module has none of its own.
    banner: {
      js: `${out.startsWith('cli/') ? '#!/usr/bin/env node\n' : ''}import { createRequire as __createRequire } from 'node:module'; const require = __createRequire(import.meta.url);`,
    },
    logLevel: 'warning',
  });
}
