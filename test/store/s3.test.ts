import { Readable } from 'node:stream';
import {
  CopyObjectCommand,
  DeleteObjectCommand,
  GetObjectCommand,
  HeadObjectCommand,
  ListObjectsV2Command,
  PutObjectCommand,
  S3Client,
  S3ServiceException,
} from '@aws-sdk/client-s3';
import { mockClient } from 'aws-sdk-client-mock';
import { beforeEach, describe, expect, it } from 'vitest';
import { createS3Store } from '../../src/store/s3.ts';
import { bytes, keysOf, readAll, text } from './contract.ts';

const client = mockClient(S3Client);
const store = createS3Store({
  client: new S3Client({ region: 'eu-west-1' }),
  bucket: 'desk-mail',
  prefix: 'north',
});
beforeEach(() => {
  client.reset();
});

const inputs = (): unknown[] => client.calls().map((call) => call.args[0].input);
const failure = (httpStatusCode: number, name: string): S3ServiceException =>
  new S3ServiceException({ name, $fault: 'client', message: 'as S3 says it', $metadata: { httpStatusCode } });
const bodyOf = (value: string) =>
  Object.assign(Readable.from([bytes(value)]), { transformToByteArray: async () => bytes(value) }) as never;
const head = {
  ETag: '"e1"',
  ContentLength: 4,
  LastModified: new Date('2026-03-01T10:00:00Z'),
  ContentType: 'message/rfc822',
  Metadata: { 'tallypost-queue': 'leaks' },
};

describe('requests to S3', () => {
  it('read with the version that must differ', async () => {
    client.on(GetObjectCommand).resolves({ ...head, Body: bodyOf('mail') });
    const got = await store.get('inbound/a b', { ifNoneMatch: '"e0"' });
    expect(inputs()).toEqual([{ Bucket: 'desk-mail', Key: 'north/inbound/a b', IfNoneMatch: '"e0"' }]);
    expect(got).toEqual({
      kind: 'found',
      object: {
        key: 'inbound/a b',
        etag: '"e1"',
        bytes: 4,
        modifiedAtMs: 1772359200000, // 2026-03-01T10:00:00Z
        contentType: 'message/rfc822',
        metadata: { 'tallypost-queue': 'leaks' },
        body: bytes('mail'),
      },
    });
  });

  it('read without a condition when none is given', async () => {
    client.on(GetObjectCommand).resolves({ ...head, Body: bodyOf('mail') });
    await store.get('a');
    expect(inputs()).toEqual([{ Bucket: 'desk-mail', Key: 'north/a' }]);
  });

  it('stream', async () => {
    client.on(GetObjectCommand).resolves({ ...head, Body: bodyOf('mail') });
    const streamed = await store.stream('a');
    expect(streamed?.head.etag).toBe('"e1"');
    expect(text(await readAll(streamed?.chunks ?? (async function* () {})()))).toBe('mail');
  });

  it('create only where there is nothing', async () => {
    client.on(PutObjectCommand).resolves({ ETag: '"e2"' });
    const result = await store.put('model/x.json', bytes('{}'), { ifNoneMatch: '*', metadata: { a: 'b' } });
    expect(result).toEqual({ kind: 'written', etag: '"e2"' });
    expect(inputs()).toEqual([
      {
        Bucket: 'desk-mail',
        Key: 'north/model/x.json',
        Body: bytes('{}'),
        ContentType: 'application/json',
        Metadata: { a: 'b' },
        IfNoneMatch: '*',
      },
    ]);
  });

  it('replace only the version that was read', async () => {
    client.on(PutObjectCommand).resolves({ ETag: '"e2"' });
    await store.put('model/x', bytes('1'), { ifMatch: '"e1"', contentType: 'text/plain' });
    expect(inputs()).toEqual([
      {
        Bucket: 'desk-mail',
        Key: 'north/model/x',
        Body: bytes('1'),
        ContentType: 'text/plain',
        IfMatch: '"e1"',
      },
    ]);
  });

  it('replace metadata by a copy onto itself that keeps the content type and the version', async () => {
    client.on(HeadObjectCommand).resolves(head);
    client.on(CopyObjectCommand).resolves({ CopyObjectResult: { ETag: '"e1"' } });
    const result = await store.replaceMetadata(
      "inbound/a b+c/ü'",
      { 'tallypost-queue': 'billing' },
      { ifMatch: '"e1"' },
    );
    expect(result).toEqual({ kind: 'written', etag: '"e1"' });
    expect(inputs()).toEqual([
      { Bucket: 'desk-mail', Key: "north/inbound/a b+c/ü'" },
      {
        Bucket: 'desk-mail',
        Key: "north/inbound/a b+c/ü'",
        CopySource: "desk-mail/north/inbound/a%20b%2Bc/%C3%BC'",
        CopySourceIfMatch: '"e1"',
        IfMatch: '"e1"',
        MetadataDirective: 'REPLACE',
        Metadata: { 'tallypost-queue': 'billing' },
        ContentType: 'message/rfc822',
      },
    ]);
  });

  it('do not copy when the version has changed already', async () => {
    client.on(HeadObjectCommand).resolves(head);
    expect(await store.replaceMetadata('a', {}, { ifMatch: '"e0"' })).toEqual({ kind: 'lost' });
    expect(client.calls()).toHaveLength(1);
  });

  it('list page after page, with keys that XML cannot hold, without the folders of the console', async () => {
    client
      .on(ListObjectsV2Command)
      .resolvesOnce({
        IsTruncated: true,
        NextContinuationToken: 'more',
        Contents: [
          { Key: 'north/inbound/', ETag: '"d"', Size: 0 },
          { Key: 'north/inbound/a+b%2Bc%C3%BC', ETag: '"e1"', Size: 4, LastModified: new Date(1000) },
        ],
      })
      .resolvesOnce({
        IsTruncated: false,
        Contents: [{ Key: 'north/inbound/z', ETag: '"e2"', Size: 5, LastModified: new Date(2000) }],
      });
    const listed = [];
    for await (const item of store.list('inbound/', { after: 'inbound/A' })) listed.push(item);
    expect(listed).toEqual([
      { key: 'inbound/a b+cü', etag: '"e1"', bytes: 4, modifiedAtMs: 1000 },
      { key: 'inbound/z', etag: '"e2"', bytes: 5, modifiedAtMs: 2000 },
    ]);
    const first = {
      Bucket: 'desk-mail',
      Prefix: 'north/inbound/',
      EncodingType: 'url',
      StartAfter: 'north/inbound/A',
    };
    expect(inputs()).toEqual([first, { ...first, ContinuationToken: 'more' }]);
  });

  it('delete', async () => {
    client.on(DeleteObjectCommand).resolves({});
    await store.delete('a');
    expect(inputs()).toEqual([{ Bucket: 'desk-mail', Key: 'north/a' }]);
  });

  it('use the whole bucket without a prefix', async () => {
    client
      .on(ListObjectsV2Command)
      .resolves({ Contents: [{ Key: 'a', ETag: '"e"', Size: 1, LastModified: new Date(0) }] });
    const whole = createS3Store({
      client: new S3Client({ region: 'eu-west-1' }),
      bucket: 'desk-mail',
      prefix: '',
    });
    expect(await keysOf(whole, '')).toEqual(['a']);
    expect(inputs()).toEqual([{ Bucket: 'desk-mail', Prefix: '', EncodingType: 'url' }]);
  });
});

describe('answers of S3', () => {
  it.each([
    // The SDK has no name for a 304 without a body.
    ['304', 304, 'Unknown', { kind: 'not-modified' }],
    ['404', 404, 'NoSuchKey', { kind: 'missing' }],
  ])('%s to a read', async (_, status, name, expected) => {
    client.on(GetObjectCommand).rejects(failure(status, name));
    expect(await store.get('a', { ifNoneMatch: '"e1"' })).toEqual(expected);
  });

  it('404 to a head or a stream', async () => {
    client.on(HeadObjectCommand).rejects(failure(404, 'NotFound'));
    client.on(GetObjectCommand).rejects(failure(404, 'NoSuchKey'));
    expect(await store.head('a')).toBeNull();
    expect(await store.stream('a')).toBeNull();
  });

  it.each([
    [412, 'PreconditionFailed'],
    [409, 'ConditionalRequestConflict'],
    [404, 'NoSuchKey'],
  ])('%i %s to a conditional write: lost', async (status, name) => {
    client.on(PutObjectCommand).rejects(failure(status, name));
    expect(await store.put('a', bytes('1'), { ifMatch: '"e1"' })).toEqual({ kind: 'lost' });
  });

  it.each([
    [412, 'PreconditionFailed', 'lost'],
    [409, 'ConditionalRequestConflict', 'lost'],
    [404, 'NoSuchKey', 'missing'],
  ])('%i %s to a copy: %s', async (status, name, kind) => {
    client.on(HeadObjectCommand).resolves(head);
    client.on(CopyObjectCommand).rejects(failure(status, name));
    expect(await store.replaceMetadata('a', {}, { ifMatch: '"e1"' })).toEqual({ kind });
  });

  it.each([
    [403, 'AccessDenied', 'store-refused', '403 AccessDenied'],
    [404, 'NoSuchBucket', 'store-missing', '404 NoSuchBucket'],
    [503, 'SlowDown', 'store-unavailable', '503 SlowDown'],
    [500, 'InternalError', 'store-unavailable', '500 InternalError'],
    [400, 'EntityTooLarge', 'store-failed', '400 EntityTooLarge'],
  ])('%i %s: an error of our own with its cause', async (status, name, code, got) => {
    const cause = failure(status, name);
    client.rejects(cause);
    const expected = { name: 'TallypostError', code, place: 's3://desk-mail/north/a', got, cause };
    await expect(store.get('a')).rejects.toMatchObject(expected);
    await expect(store.head('a')).rejects.toMatchObject(expected);
    await expect(store.stream('a')).rejects.toMatchObject(expected);
    await expect(store.put('a', bytes('1'))).rejects.toMatchObject(expected);
    await expect(store.put('a', bytes('1'), { ifNoneMatch: '*' })).rejects.toMatchObject(expected);
    await expect(store.delete('a')).rejects.toMatchObject(expected);
    await expect(keysOf(store, 'a')).rejects.toMatchObject(expected);
  });

  it('none at all: an error that says so', async () => {
    client.on(GetObjectCommand).rejects(Object.assign(new Error('connect'), { name: 'TimeoutError' }));
    await expect(store.get('a')).rejects.toMatchObject({ code: 'store-unavailable', got: 'TimeoutError' });
  });

  it('412 without a condition: an error, not a lost race', async () => {
    client.on(PutObjectCommand).rejects(failure(412, 'PreconditionFailed'));
    await expect(store.put('a', bytes('1'))).rejects.toMatchObject({ code: 'store-failed' });
  });

  it('a body above the bound is not read', async () => {
    const body = Readable.from([bytes('mail')]);
    client.on(GetObjectCommand).resolves({ ...head, Body: body as never });
    await expect(store.get('a', { bytesMax: 3 })).rejects.toMatchObject({ code: 'object-too-large' });
    expect(body.destroyed).toBe(true);
  });

  it('a body that breaks off is an error', async () => {
    const body = Readable.from(
      (async function* () {
        yield bytes('ma');
        throw Object.assign(new Error('aborted'), { code: 'ECONNRESET', name: 'Error' });
      })(),
    );
    client.on(GetObjectCommand).resolves({ ...head, Body: body as never });
    const streamed = await store.stream('a');
    await expect(readAll(streamed?.chunks ?? (async function* () {})())).rejects.toMatchObject({
      name: 'TallypostError',
      code: 'store-unavailable',
    });
  });
});
