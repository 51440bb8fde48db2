// Accuracy beside scikit-learn's classifiers, on the same messages and the same split, as one table.
//   node test/bench/accuracy/run.mjs --learn PATH --score PATH [--text own|all] [--baselines-only]
// Needs Debian's python3-sklearn for the baselines, and says so when it is absent. --text own gives the baselines the text without
// quoted history and signatures, as the product reads it.
import { execFileSync, spawnSync } from 'node:child_process';
import { createWriteStream, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { build } from 'esbuild';

const root = new URL('../../..', import.meta.url).pathname;
const { values } = parseArgs({
  options: {
    learn: { type: 'string' },
    score: { type: 'string' },
    text: { type: 'string', default: 'all' },
    'baselines-only': { type: 'boolean', default: false },
  },
});
if (values.learn === undefined || values.score === undefined) {
  console.error('usage: run.mjs --learn PATH --score PATH [--text own|all]');
  process.exit(2);
}

const folder = mkdtempSync(join(tmpdir(), 'tallypost-bench-'));
try {
  const rows = [];
  if (!values['baselines-only']) rows.push(await replayRow());
  rows.push(...(await baselineRows()));
  print(rows);
} finally {
  rmSync(folder, { recursive: true, force: true });
}

async function replayRow() {
  const script = join(folder, 'tallypost.mjs');
  await bundle({ entryPoints: ['src/cli/tallypost.ts'], outfile: script });
  const started = process.hrtime.bigint();
  const args = ['replay', '--learn', values.learn, '--score', values.score, '--json'];
  const output = execFileSync('node', [script, ...args], { maxBuffer: 1 << 28, encoding: 'utf8' });
  const seconds = Number(process.hrtime.bigint() - started) / 1e9;
  return { method: 'tallypost', ...JSON.parse(output), seconds };
}

function bundle(options) {
  return build({
    absWorkingDir: root,
    bundle: true,
    platform: 'node',
    format: 'esm',
    mainFields: ['module', 'main'],
    banner: { js: `import { createRequire as __r } from 'node:module'; const require = __r(import.meta.url);` },
    logLevel: 'warning',
    ...options,
  });
}

/** The baselines see the text that the product's own parser read: subject, then the body. */
async function baselineRows() {
  const reader = join(folder, 'texts.mjs');
  await bundle({
    stdin: {
      contents: `export { readLabelled } from './src/cli/labelled/read-labelled.ts';
        export { parseMail } from './src/message/mail.ts';
        export { parseForm } from './src/message/form.ts';`,
      resolveDir: root,
      loader: 'ts',
    },
    outfile: reader,
  });
  const { readLabelled, parseMail, parseForm } = await import(reader);
  const write = async (from, to) => {
    const file = createWriteStream(to);
    for await (const each of readLabelled(from)) {
      if (each.kind === 'bad') continue;
      const { content, label } = each;
      const message = content.kind === 'mail' ? await parseMail(content.raw) : parseForm(content.json);
      const body = values.text === 'own' ? message.ownText : message.text;
      file.write(`${JSON.stringify({ queue: label, text: `${message.subject}\n${body}` })}\n`);
    }
    await new Promise((done) => file.end(done));
  };
  const [learn, score] = [join(folder, 'learn.jsonl'), join(folder, 'score.jsonl')];
  await write(values.learn, learn);
  await write(values.score, score);
  // Debian's packages belong to Debian's own interpreter, which need not be the first on the path.
  for (const python of ['/usr/bin/python3', 'python3']) {
    const run = spawnSync(python, [join(root, 'test/bench/accuracy/baselines.py'), learn, score], {
      maxBuffer: 1 << 28,
      encoding: 'utf8',
      stdio: ['ignore', 'pipe', 'inherit'],
    });
    if (run.status === 0) return JSON.parse(run.stdout).rows;
    if (run.status !== 3 && run.error === undefined) throw new Error(`baselines ended with ${run.status}`);
  }
  console.log('scikit-learn is not here (Debian: apt-get install python3-sklearn); baselines left out.');
  return [];
}

function print(rows) {
  const cells = (row) => [
    row.method,
    ...['accuracy', 'logLoss', 'calibrationError', 'routedAt95'].map((name) =>
      row[name] === undefined ? '-' : row[name].toFixed(4),
    ),
    row.seconds.toFixed(1),
  ];
  const table = [['method', 'accuracy', 'log loss', 'ECE', 'routed at 95 %', 'seconds'], ...rows.map(cells)];
  const widths = table[0].map((_, column) => Math.max(...table.map((row) => row[column].length)));
  for (const row of table) {
    const [name, ...numbers] = row;
    console.log(
      [name.padEnd(widths[0]), ...numbers.map((cell, at) => cell.padStart(widths[at + 1]))].join('  '),
    );
  }
}
