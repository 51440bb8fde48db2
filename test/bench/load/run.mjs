// Load: messages and their confirmations through the handlers, by several processes at once, with repeated deliveries and one
// process killed in the middle; then what came of it is judged. Ends with 1 when anything is wrong.
//   node test/bench/load/run.mjs [--messages N] [--processes P] [--seed S] [--s3 ENDPOINT] [--keep]
// --messages: 2000, at most 20000. --s3: a server started by test/race/s3-server.sh, in the place of a directory.
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { bundleEntries } from '../bundle.mjs';

const { values } = parseArgs({
  options: {
    messages: { type: 'string', default: '2000' },
    processes: { type: 'string', default: '3' },
    seed: { type: 'string', default: '5' },
    s3: { type: 'string' },
    keep: { type: 'boolean', default: false },
  },
});
const messages = Number(values.messages);
if (!(messages >= 1 && messages <= 20_000)) {
  console.error('--messages takes 1 to 20000');
  process.exit(2);
}
const folder = mkdtempSync(join(tmpdir(), 'tallypost-load-'));
try {
  await bundleEntries(
    ['test/bench/load/load.ts', 'test/bench/load/worker.ts', 'test/race/s3-shim.ts'],
    folder,
  );
  const { runLoad } = await import(join(folder, 'load.mjs'));
  let place = { kind: 'directory', path: join(folder, 'store') };
  if (values.s3 !== undefined) {
    const { createShimmedClient, makeBucket } = await import(join(folder, 's3-shim.mjs'));
    place = { kind: 's3', endpoint: values.s3, bucket: await makeBucket(createShimmedClient(values.s3)) };
  }
  const report = await runLoad({
    worker: join(folder, 'worker.mjs'),
    place,
    messages,
    processes: Number(values.processes),
    seed: Number(values.seed),
  });
  console.log(JSON.stringify(report, null, 2));
  // Ceph's radosgw ignores the conditions of a copy (see test/race/s3-shim.ts), by which the second of two deliveries at the same
  // moment would find out: both write the same decision there.
  const { decidedTwice, ...others } = report.wrong;
  const isOnce = values.s3 !== undefined || decidedTwice === 0;
  const isRight = isOnce && Object.values(others).every((each) => (Array.isArray(each) ? each.length === 0 : each === 0));
  const routed = decidedTwice === 0 ? 'everything routed once' : `everything routed, ${decidedTwice} twice at the same moment`;
  console.log(isRight ? `${routed}, recount exact` : 'WRONG: see above');
  if (!isRight) process.exitCode = 1;
} finally {
  if (values.keep) console.log(folder);
  else rmSync(folder, { recursive: true, force: true });
}
