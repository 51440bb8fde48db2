import { createServer, type IncomingMessage, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import type { Store } from '../../src/store/store.ts';

/** As much of S3's protocol on loopback as the store adapter speaks, over a store: enough for a bundle in a process of its
 *  own. Source: Amazon S3 API Reference. Conditional requests are as Amazon's; signatures are not looked at. */
export interface LoopbackS3 {
  readonly endpoint: string;
  /** `GET /bucket/key` and so on, in order. */
  readonly requests: string[];
  close(): Promise<void>;
}

const escapeXml = (text: string): string =>
  text.replaceAll('&', '&amp;').replaceAll('<', '&lt;').replaceAll('>', '&gt;');

export async function startLoopbackS3(store: Store, bucket: string): Promise<LoopbackS3> {
  const requests: string[] = [];

  async function answer(request: IncomingMessage, response: ServerResponse): Promise<void> {
    const chunks: Buffer[] = [];
    for await (const chunk of request) chunks.push(chunk as Buffer);
    const url = new URL(request.url ?? '/', 'http://loopback');
    requests.push(`${request.method} ${decodeURIComponent(url.pathname)}`);
    const header = (name: string): string | undefined => request.headers[name] as string | undefined;
    const say = (
      status: number,
      headers: Record<string, string | number> = {},
      body: string | Uint8Array = '',
    ): void => {
      response.writeHead(status, headers).end(request.method === 'HEAD' ? undefined : body);
    };
    const refuse = (status: number, code: string): void =>
      say(
        status,
        { 'content-type': 'application/xml' },
        `<?xml version="1.0"?><Error><Code>${code}</Code></Error>`,
      );

    const [, place, ...rest] = url.pathname.split('/');
    if (place !== bucket) return refuse(404, 'NoSuchBucket');
    const key = decodeURIComponent(rest.join('/'));
    if (key === '') return list(url.searchParams, say);
    const metadata = Object.fromEntries(
      Object.entries(request.headers)
        .filter(([name]) => name.startsWith('x-amz-meta-'))
        .map(([name, value]) => [name.slice('x-amz-meta-'.length), String(value)]),
    );
    const quoted = (etag: string): string => `"${etag}"`;
    const unquoted = (etag: string | undefined): string | undefined => etag?.replaceAll('"', '');

    if (request.method === 'GET' || request.method === 'HEAD') {
      const got = await store.get(key);
      if (got.kind !== 'found') return refuse(404, 'NoSuchKey');
      const { object } = got;
      const headers = {
        etag: quoted(object.etag),
        'content-type': object.contentType,
        'content-length': object.bytes,
        'last-modified': new Date(object.modifiedAtMs).toUTCString(),
        ...Object.fromEntries(
          Object.entries(object.metadata).map(([name, value]) => [`x-amz-meta-${name}`, value]),
        ),
      };
      if (header('if-none-match') === headers.etag) return say(304, { etag: headers.etag });
      return say(200, headers, object.body);
    }
    if (request.method === 'DELETE') {
      const ifMatch = unquoted(header('if-match'));
      if (ifMatch !== undefined) {
        const head = await store.head(key);
        if (head !== null && head.etag !== ifMatch) return refuse(412, 'PreconditionFailed');
      }
      await store.delete(key, ifMatch === undefined ? {} : { ifMatch });
      return say(204);
    }
    if (request.method !== 'PUT') return refuse(405, 'MethodNotAllowed');
    if (header('x-amz-copy-source') !== undefined) {
      if (
        header('x-amz-copy-source') !== `${bucket}/${rest.join('/')}` ||
        header('x-amz-metadata-directive') !== 'REPLACE'
      )
        return refuse(400, 'InvalidRequest');
      const ifMatch = unquoted(header('x-amz-copy-source-if-match') ?? header('if-match')) ?? '';
      const copied = await store.replaceMetadata(key, metadata, { ifMatch });
      if (copied.kind === 'missing') return refuse(404, 'NoSuchKey');
      if (copied.kind === 'lost') return refuse(412, 'PreconditionFailed');
      const result = `<CopyObjectResult><ETag>${quoted(copied.etag)}</ETag></CopyObjectResult>`;
      return say(200, { 'content-type': 'application/xml' }, `<?xml version="1.0"?>${result}`);
    }
    const ifMatch = unquoted(header('if-match'));
    const put = await store.put(key, bodyOf(request, Buffer.concat(chunks)), {
      metadata,
      ...(header('content-type') === undefined ? {} : { contentType: header('content-type') as string }),
      ...(ifMatch === undefined ? {} : { ifMatch }),
      ...(header('if-none-match') === '*' ? { ifNoneMatch: '*' as const } : {}),
    });
    return put.kind === 'lost' ? refuse(412, 'PreconditionFailed') : say(200, { etag: quoted(put.etag) });
  }

  async function list(
    query: URLSearchParams,
    say: (status: number, headers: Record<string, string>, body: string) => void,
  ): Promise<void> {
    const contents: string[] = [];
    const after = query.get('start-after');
    for await (const item of store.list(query.get('prefix') ?? '', after === null ? {} : { after }))
      contents.push(
        `<Contents><Key>${encodeURIComponent(item.key)}</Key><ETag>${escapeXml(`"${item.etag}"`)}</ETag><Size>${item.bytes}</Size>` +
          `<LastModified>${new Date(item.modifiedAtMs).toISOString()}</LastModified></Contents>`,
      );
    const body = `<?xml version="1.0"?><ListBucketResult><IsTruncated>false</IsTruncated>${contents.join('')}</ListBucketResult>`;
    say(200, { 'content-type': 'application/xml' }, body);
  }

  const server = createServer((request, response) => {
    answer(request, response).catch((error) => {
      response.writeHead(500).end(String(error));
    });
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return {
    endpoint: `http://127.0.0.1:${(server.address() as AddressInfo).port}`,
    requests,
    close: () =>
      new Promise((resolve) => {
        server.closeAllConnections();
        server.close(() => resolve());
      }),
  };
}

/** The SDK may send a body in signed chunks: `size;chunk-signature=...` or `size`, CRLF, bytes, CRLF, up to a chunk of 0. */
function bodyOf(request: IncomingMessage, sent: Buffer): Uint8Array {
  if (!String(request.headers['content-encoding'] ?? '').includes('aws-chunked')) return sent;
  const parts: Buffer[] = [];
  for (let at = 0; at < sent.length; ) {
    const end = sent.indexOf('\r\n', at);
    const size = Number.parseInt(sent.toString('latin1', at, end), 16);
    if (!(size > 0)) break;
    parts.push(sent.subarray(end + 2, end + 2 + size));
    at = end + 2 + size + 2;
  }
  return Buffer.concat(parts);
}
