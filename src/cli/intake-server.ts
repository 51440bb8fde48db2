import { randomUUID } from 'node:crypto';
import { createServer, type IncomingMessage, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { bounds } from '../bounds.ts';
import type { UrlEvent, UrlResult } from '../handlers/url-event.ts';

export interface IntakeServer {
  /** With a slash at its end, as the function's URL has one. */
  readonly url: string;
  close(): Promise<void>;
}

const host = '127.0.0.1';
/** A byte more than the intake reads, so that it sees that there is more. */
const bodyBytesMax = Math.max(bounds.intakeFormBytesMax, bounds.intakeWebhookBytesMax) + 1;

/** Serves the intake's handler on this machine only, each request as the event that a function URL makes of it. `port` 0: any
 *  that is free. Rejects when the port is taken. */
export async function startIntakeServer(
  handle: (event: UrlEvent) => Promise<UrlResult>,
  port: number,
): Promise<IntakeServer> {
  const server = createServer((request, response) => void serve(handle, request, response));
  server.requestTimeout = 30_000;
  await new Promise<void>((resolve, reject) => {
    server.once('error', reject);
    server.listen(port, host, resolve);
  });
  return {
    url: `http://${host}:${(server.address() as AddressInfo).port}/`,
    async close() {
      server.closeAllConnections();
      await new Promise<void>((resolve) => server.close(() => resolve()));
    },
  };
}

async function serve(
  handle: (event: UrlEvent) => Promise<UrlResult>,
  request: IncomingMessage,
  response: ServerResponse,
): Promise<void> {
  try {
    const { body, isWhole } = await readBody(request);
    const result = await handle(eventOf(request, body));
    // What was not read of a body would be taken for the next request.
    response.writeHead(result.statusCode, { ...result.headers, ...(isWhole ? {} : { connection: 'close' }) });
    response.end(result.body);
  } catch {
    // The sender went away.
    response.destroy();
  }
}

async function readBody(
  request: IncomingMessage,
): Promise<{ readonly body: Buffer; readonly isWhole: boolean }> {
  const parts: Buffer[] = [];
  let bytes = 0;
  for await (const part of request.iterator({ destroyOnReturn: false }) as AsyncIterable<Buffer>) {
    parts.push(part);
    bytes += part.length;
    if (bytes >= bodyBytesMax)
      return { body: Buffer.concat(parts).subarray(0, bodyBytesMax), isWhole: false };
  }
  return { body: Buffer.concat(parts), isWhole: true };
}

/** Source: AWS Lambda Developer Guide, "Invoking Lambda function URLs", request payload format 2.0. */
function eventOf(request: IncomingMessage, body: Buffer): UrlEvent {
  const headers = Object.entries(request.headers).map(([name, value]) => [name, [value].flat().join(',')]);
  return {
    rawPath: (request.url ?? '/').split('?', 1)[0]!,
    headers: Object.fromEntries(headers),
    body: body.toString('base64'),
    isBase64Encoded: true,
    requestContext: { requestId: randomUUID(), http: { method: request.method ?? 'GET' } },
  };
}
