import { mkdirSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { eventFiles } from './lambda-events.ts';
import { samples } from './samples.ts';

/** Writes events/ anew: `node … FOLDER`. */
const folder = process.argv[2];
if (folder === undefined) throw new Error('expected the folder to write into');
for (const [path, bytes] of eventFiles(samples())) {
  mkdirSync(dirname(join(folder, path)), { recursive: true });
  writeFileSync(join(folder, path), bytes);
}
