// Loads one bundle and serves it events: what the managed runtime does, by the published runtime protocol.
// Source: AWS Lambda Developer Guide, "Using the Lambda runtime API for custom runtimes".
import { pathToFileURL } from 'node:url';

const api = `http://${process.env.AWS_LAMBDA_RUNTIME_API}/2018-06-01/runtime`;
const post = (path, body) =>
  fetch(`${api}${path}`, {
    method: 'POST',
    body,
    headers: { 'x-peak-mb': String(process.resourceUsage().maxRSS / 1024) },
  });
const described = (error) => JSON.stringify({ errorType: error?.name ?? 'Error', errorMessage: String(error?.message ?? error) });

const startedMs = performance.now();
const before = process.cpuUsage();
let handler;
try {
  ({ handler } = await import(pathToFileURL(process.argv[2]).href));
  if (typeof handler !== 'function') throw new Error('the bundle exports no function named handler');
} catch (error) {
  await post('/init/error', described(error));
  process.exit(1);
}
const used = process.cpuUsage(before);
const init = JSON.stringify({
  wallMs: performance.now() - startedMs,
  cpuMs: (used.user + used.system) / 1000,
  residentMb: process.memoryUsage().rss / 1e6,
});

for (;;) {
  const next = await fetch(`${api}/invocation/next`, { headers: { 'x-init': init } });
  const id = next.headers.get('lambda-runtime-aws-request-id');
  try {
    const answer = await handler(await next.json(), { awsRequestId: id });
    await post(`/invocation/${id}/response`, JSON.stringify(answer));
  } catch (error) {
    await post(`/invocation/${id}/error`, described(error));
  }
}
