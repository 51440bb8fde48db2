// Measures the initialisation of each built function beside that of a bundle with the same third-party imports and nothing of
// ours, both started by the runtime protocol, in turns: node test/lambda/measure-init.mjs [rounds]
// TALLYPOST_LAMBDA_NODE names the Node to measure on. Prints medians of the processor's time, which a busy machine distorts least.
import { spawn } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { createServer } from 'node:http';
import { join } from 'node:path';
import { build } from 'esbuild';
import { functions, optionsOf } from '../../.config/bundle.mjs';

const root = new URL('../../', import.meta.url).pathname;
const node = process.env.TALLYPOST_LAMBDA_NODE ?? process.execPath;
const rounds = Number(process.argv[2] ?? 9);
const work = mkdtempSync(join(root, 'dist/measure-'));

/** The imports of packages that our own modules of a bundle make, by name, so that they are shaken alike. */
function importsIn(inputs) {
  const names = new Map();
  for (const path of Object.keys(inputs).filter((one) => one.startsWith('src/'))) {
    const source = readFileSync(root + path, 'utf8');
    for (const [, list, from] of source.matchAll(/^import ([^;]*?) from '([^.'][^']*)';/gms)) {
      if (from.startsWith('node:') || list.startsWith('type ')) continue;
      const braces = /\{([^}]*)\}/.exec(list)?.[1] ?? '';
      const named = braces.split(',').map((one) => one.trim()).filter((one) => one && !one.startsWith('type '));
      const plain = list.replace(/\{[^}]*\}/, '').replace(/,/g, '').trim();
      for (const one of named) names.set(`${from} ${one}`, { from, name: one.split(' as ')[0].trim() });
      if (plain !== '') names.set(`${from} default`, { from, name: plain.startsWith('*') ? '*' : 'default' });
    }
  }
  return [...names.values()];
}

async function bundlePair(name) {
  const entry = `src/handlers/lambda/${name}.ts`;
  const ours = join(work, `${name}.mjs`);
  const { metafile } = await build({ ...optionsOf(entry, ours), minify: true, metafile: true });
  const imports = importsIn(metafile.inputs);
  const lines = imports.map(({ from, name: what }, i) =>
    what === '*' ? `import * as i${i} from '${from}';` : `import { ${what} as i${i} } from '${from}';`);
  const source = join(work, `${name}-packages.js`);
  writeFileSync(source, `${lines.join('\n')}\nexport const handler = async () => [${imports.map((_, i) => `i${i}`)}].length;\n`);
  const packages = join(work, `${name}-packages.mjs`);
  await build({ ...optionsOf(source, packages), minify: true });
  return { name, ours, packages, imports: [...new Set(imports.map(({ from }) => from))] };
}

function initOf(bundle) {
  return new Promise((resolve, reject) => {
    const server = createServer((request, response) => {
      if (request.url.endsWith('/next')) {
        resolve(JSON.parse(request.headers['x-init']));
        child.kill('SIGKILL');
      } else {
        request.on('data', (text) => reject(new Error(String(text))));
        response.end();
      }
    });
    let child;
    server.listen(0, '127.0.0.1', () => {
      child = spawn(node, [join(root, 'test/lambda/bootstrap.mjs'), bundle], {
        env: {
          AWS_LAMBDA_RUNTIME_API: `127.0.0.1:${server.address().port}`,
          AWS_REGION: 'eu-west-2',
          AWS_ACCESS_KEY_ID: 'a',
          AWS_SECRET_ACCESS_KEY: 'b',
          TALLYPOST_BUCKET: 'measure',
          NODE_NO_WARNINGS: '1',
        },
        stdio: 'inherit',
      });
      child.once('exit', () => {
        server.closeAllConnections();
        server.close();
      });
    });
  });
}

const median = (values) => values.sort((a, b) => a - b)[Math.floor(values.length / 2)];

try {
  console.log(`Node ${node === process.execPath ? process.version : node}, medians of ${rounds} starts each`);
  console.log('function     bytes   init CPU ms   packages only   ratio   resident MB   packages only');
  for (const name of functions) {
    const pair = await bundlePair(name);
    const ours = [];
    const packages = [];
    for (let round = 0; round < rounds; round += 1) {
      ours.push(await initOf(pair.ours));
      packages.push(await initOf(pair.packages));
    }
    const [cpu, base] = [ours, packages].map((all) => median(all.map((one) => one.cpuMs)));
    const [memory, baseMemory] = [ours, packages].map((all) => median(all.map((one) => one.residentMb)));
    const cells = [
      name.padEnd(9),
      String(readFileSync(pair.ours).length).padStart(8),
      cpu.toFixed(0).padStart(13),
      base.toFixed(0).padStart(15),
      (cpu / base).toFixed(2).padStart(7),
      memory.toFixed(0).padStart(13),
      baseMemory.toFixed(0).padStart(15),
    ];
    console.log(cells.join(' '));
  }
} finally {
  rmSync(work, { recursive: true, force: true });
}
