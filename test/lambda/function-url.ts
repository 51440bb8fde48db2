import { execFileSync } from 'node:child_process';
import { randomUUID } from 'node:crypto';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import type { IncomingMessage, ServerResponse } from 'node:http';
import { createServer } from 'node:https';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { StartedFunction } from './runtime.ts';

export interface FunctionUrl {
  /** Without a slash at its end. */
  readonly origin: string;
  close(): Promise<void>;
}

interface Result {
  readonly statusCode: number;
  readonly headers: Readonly<Record<string, string>>;
  readonly cookies?: readonly string[];
  readonly body: string;
}

/** A certificate for this machine that nobody vouches for; null where there is no openssl. */
export function makeCertificate(): { readonly key: Buffer; readonly cert: Buffer } | null {
  const folder = mkdtempSync(join(tmpdir(), 'tallypost-tls-'));
  const [key, cert] = [join(folder, 'key'), join(folder, 'cert')];
  const subject = ['-subj', '/CN=127.0.0.1', '-addext', 'subjectAltName=IP:127.0.0.1'];
  const kind = ['-newkey', 'ec', '-pkeyopt', 'ec_paramgen_curve:prime256v1', '-nodes', '-days', '2'];
  try {
    execFileSync('openssl', ['req', '-x509', ...kind, ...subject, '-keyout', key, '-out', cert], {
      stdio: 'ignore',
    });
    return { key: readFileSync(key), cert: readFileSync(cert) };
  } catch {
    return null;
  } finally {
    rmSync(folder, { recursive: true });
  }
}

/** Serves a started function as its URL would: each request as an event of payload format 2.0, one at a time, over TLS.
 *  Source: AWS Lambda Developer Guide, "Invoking Lambda function URLs": cookies stand apart from the headers both ways, names
 *  are lower-case, bodies that are no text come in base64; `set-cookie` among an answer's headers is not passed on. */
export async function startFunctionUrl(
  one: StartedFunction,
  certificate: { readonly key: Buffer; readonly cert: Buffer },
): Promise<FunctionUrl> {
  let last: Promise<unknown> = Promise.resolve();
  async function serve(request: IncomingMessage, response: ServerResponse): Promise<void> {
    const chunks: Buffer[] = [];
    for await (const chunk of request) chunks.push(chunk as Buffer);
    const event = eventOf(request, Buffer.concat(chunks));
    const before = last;
    const answered = before.then(() => one.invoke(event));
    last = answered.catch(() => {});
    const { kind, value } = await answered;
    if (kind === 'error') return void response.writeHead(502).end();
    const { statusCode, headers, cookies = [], body } = value as Result;
    const { 'set-cookie': _, ...passed } = headers;
    response.writeHead(statusCode, { ...passed, 'set-cookie': [...cookies] }).end(body);
  }
  const server = createServer(certificate, (request, response) => void serve(request, response));
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    origin: `https://127.0.0.1:${(server.address() as AddressInfo).port}`,
    async close() {
      server.closeAllConnections();
      await new Promise((resolve) => server.close(resolve));
    },
  };
}

function eventOf(request: IncomingMessage, body: Buffer): object {
  const [rawPath = '/', rawQueryString = ''] = (request.url ?? '/').split('?');
  const { cookie, ...headers } = request.headers;
  return {
    version: '2.0',
    routeKey: '$default',
    rawPath,
    rawQueryString,
    ...(cookie === undefined ? {} : { cookies: cookie.split('; ') }),
    headers,
    requestContext: {
      requestId: randomUUID(),
      domainName: headers.host,
      http: { method: request.method, path: rawPath, protocol: 'HTTP/1.1', sourceIp: '127.0.0.1' },
    },
    ...(body.length === 0 ? {} : { body: body.toString('base64') }),
    isBase64Encoded: body.length > 0,
  };
}
