import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import { S3Client } from '@aws-sdk/client-s3';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { createS3Store } from '../../src/store/s3.ts';
import type { Store } from '../../src/store/store.ts';
import { createShimmedClient, endpoint, makeBucket } from '../race/s3-shim.ts';
import { bytes, describeContract } from './contract.ts';

/** The real SDK against a loopback server that plays one answer after the other. */
describe('an answer on the wire', () => {
  type Play = (request: IncomingMessage, response: ServerResponse) => void;
  let server: Server;
  let store: Store;
  let plays: Play[] = [];
  const seen: string[] = [];

  beforeAll(async () => {
    server = createServer((request, response) => {
      seen.push(`${request.method} ${request.url}`);
      request.resume().on('end', () => (plays.shift() as Play)(request, response));
    });
    await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
    const client = new S3Client({
      endpoint: `http://127.0.0.1:${(server.address() as AddressInfo).port}`,
      region: 'eu-west-1',
      forcePathStyle: true,
      credentials: { accessKeyId: 'a', secretAccessKey: 'b' },
    });
    store = createS3Store({ client, bucket: 'desk-mail', prefix: '' });
  });
  afterAll(() => new Promise((resolve) => server.close(resolve)));

  const say =
    (status: number, headers: Record<string, string> = {}, body = ''): Play =>
    (_, response) => {
      response.writeHead(status, headers).end(body);
    };
  const hangUp: Play = (request) => {
    request.socket.destroy();
  };
  const refusal = (code: string): string => `<?xml version="1.0"?><Error><Code>${code}</Code></Error>`;

  it('that is lost comes back as a lost race when the write had landed', async () => {
    plays = [hangUp, say(412, {}, refusal('PreconditionFailed'))];
    expect(await store.put('a', bytes('1'), { ifNoneMatch: '*' })).toEqual({ kind: 'lost' });
    expect(plays).toEqual([]);
  });

  it.each([
    ['412 is not sent again', 412, 'PreconditionFailed'],
    ['409 is not sent again', 409, 'ConditionalRequestConflict'],
  ])('of %s', async (_, status, code) => {
    plays = [say(status, {}, refusal(code))];
    expect(await store.put('a', bytes('1'), { ifMatch: '"e"' })).toEqual({ kind: 'lost' });
    expect(plays).toEqual([]);
  });

  it('of 503 is asked for again, three times in all', async () => {
    plays = [say(503), say(503), say(200, { etag: '"e"' })];
    expect(await store.put('a', bytes('1'))).toEqual({ kind: 'written', etag: '"e"' });
    plays = [say(503), say(503), say(503)];
    await expect(store.put('a', bytes('1'))).rejects.toMatchObject({ code: 'store-unavailable' });
    expect(plays).toEqual([]);
  });

  it('of 304 means not modified', async () => {
    plays = [say(304, { etag: '"e"' })];
    expect(await store.get('a', { ifNoneMatch: '"e"' })).toEqual({ kind: 'not-modified' });
  });

  it('of 404 to a head, which has no body, means missing', async () => {
    plays = [say(404)];
    expect(await store.head('inbound/a b+c')).toBeNull();
    expect(seen.at(-1)).toBe('HEAD /desk-mail/inbound/a%20b%2Bc');
  });
});

const at = endpoint;
if (at === undefined)
  process.stdout.write(
    'left out: the contract of a store on a real S3-protocol server (TALLYPOST_S3_ENDPOINT is not set)\n',
  );
else
  describeContract('S3 protocol', async () => {
    const client = createShimmedClient(at);
    const bucket = await makeBucket(client);
    const make = (): Store => createS3Store({ client, bucket, prefix: 'a b/ü' });
    return { store: make(), again: make };
  });
