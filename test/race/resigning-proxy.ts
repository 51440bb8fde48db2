import { createHash, createHmac, type Hmac } from 'node:crypto';
import { createServer, type IncomingHttpHeaders, request as send } from 'node:http';
import type { AddressInfo } from 'node:net';
import { SignatureV4 } from '@smithy/signature-v4';

/** Stands between a bundle, whose client cannot be changed, and radosgw: does to its requests what s3-shim.ts does to those of
 *  a client of ours, and signs them anew, since what is changed is part of the signature. */
export interface Proxy {
  readonly endpoint: string;
  close(): Promise<void>;
}

interface Sent {
  readonly method: string;
  /** Path and query as they came. */
  readonly url: string;
  readonly headers: Readonly<Record<string, string>>;
  readonly body: Buffer;
}

interface Answered {
  readonly status: number;
  readonly headers: IncomingHttpHeaders;
  readonly body: Buffer;
}

class Sha256 {
  readonly #hash: Hmac | ReturnType<typeof createHash>;
  constructor(secret?: string | ArrayBuffer | ArrayBufferView) {
    this.#hash = secret === undefined ? createHash('sha256') : createHmac('sha256', bytesOf(secret));
  }
  update(data: string | ArrayBuffer | ArrayBufferView): void {
    this.#hash.update(bytesOf(data));
  }
  async digest(): Promise<Uint8Array> {
    return this.#hash.digest();
  }
  reset(): void {}
}

const bytesOf = (data: string | ArrayBuffer | ArrayBufferView): Uint8Array =>
  typeof data === 'string'
    ? Buffer.from(data)
    : ArrayBuffer.isView(data)
      ? new Uint8Array(data.buffer, data.byteOffset, data.byteLength)
      : new Uint8Array(data);

const signer = new SignatureV4({
  service: 's3',
  region: 'us-east-1',
  credentials: { accessKeyId: 'testkey', secretAccessKey: 'testsecret' },
  sha256: Sha256,
  uriEscapePath: false,
});

/** Names that are not passed on: of this connection, or of the signature that is made anew. */
const dropped = new Set(['host', 'connection', 'authorization', 'x-amz-date', 'expect']);

export async function startResigningProxy(at: string): Promise<Proxy> {
  const { hostname, port } = new URL(at);

  async function forward({ method, url, headers, body }: Sent): Promise<Answered> {
    const { pathname, searchParams } = new URL(url, at);
    const signed = await signer.sign({
      method,
      protocol: 'http:',
      hostname,
      port: Number(port),
      path: pathname,
      query: Object.fromEntries(searchParams),
      headers: { ...headers, host: `${hostname}:${port}` },
      body,
    });
    return new Promise((resolve, reject) => {
      const sent = send({ hostname, port, method, path: url, headers: signed.headers }, (response) => {
        const chunks: Buffer[] = [];
        response.on('data', (chunk) => chunks.push(chunk));
        response.on('end', () =>
          resolve({
            status: response.statusCode ?? 0,
            headers: response.headers,
            body: Buffer.concat(chunks),
          }),
        );
      });
      sent.on('error', reject).end(body);
    });
  }

  async function pass(sent: Sent): Promise<Answered> {
    const ifMatch = sent.headers['if-match'];
    if (sent.method === 'DELETE' && ifMatch !== undefined) {
      const { 'if-match': _, ...headers } = sent.headers;
      const head = await forward({ ...sent, method: 'HEAD', headers, body: Buffer.alloc(0) });
      const isThere = head.status === 200;
      if (isThere && head.headers.etag !== ifMatch) return refusal(412, 'PreconditionFailed');
      return isThere ? forward({ ...sent, headers }) : refusal(404, 'NoSuchKey');
    }
    const unquoted = ifMatch === undefined ? {} : { 'if-match': ifMatch.replaceAll('"', '') };
    const answered = await forward({ ...sent, headers: { ...sent.headers, ...unquoted } });
    const isConditional = ifMatch !== undefined || sent.headers['if-none-match'] !== undefined;
    return sent.method === 'PUT' && isConditional && answered.status === 500
      ? refusal(409, 'ConditionalRequestConflict')
      : answered;
  }

  const server = createServer(async (request, response) => {
    const chunks: Buffer[] = [];
    for await (const chunk of request) chunks.push(chunk as Buffer);
    const headers = Object.fromEntries(
      Object.entries(request.headers).flatMap(([name, value]) =>
        value === undefined || dropped.has(name) ? [] : [[name, String(value)]],
      ),
    );
    try {
      const { method = 'GET', url = '/' } = request;
      const answered = await pass({ method, url, headers, body: Buffer.concat(chunks) });
      response.writeHead(answered.status, answered.headers).end(answered.body);
    } catch {
      response.destroy();
    }
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    endpoint: `http://127.0.0.1:${(server.address() as AddressInfo).port}`,
    async close() {
      server.closeAllConnections();
      await new Promise((resolve) => server.close(resolve));
    },
  };
}

function refusal(status: number, code: string): Answered {
  const body = Buffer.from(`<?xml version="1.0"?><Error><Code>${code}</Code></Error>`);
  return {
    status,
    headers: { 'content-type': 'application/xml', 'content-length': String(body.length) },
    body,
  };
}
