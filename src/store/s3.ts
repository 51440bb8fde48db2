import {
  CopyObjectCommand,
  DeleteObjectCommand,
  GetObjectCommand,
  type GetObjectCommandOutput,
  HeadObjectCommand,
  ListObjectsV2Command,
  PutObjectCommand,
  type S3Client,
} from '@aws-sdk/client-s3';
import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import { checkKey, checkMetadata, checkSize, contentTypeOf } from './checks.ts';
import type { ObjectHead, PutOptions, PutResult, Store } from './store.ts';

export interface S3Place {
  readonly client: S3Client;
  readonly bucket: string;
  /** Keys of this store stand below `<prefix>/`; empty for the whole bucket. */
  readonly prefix: string;
}

/** A store in an S3 bucket. Reads and single-key writes are strongly consistent; the ETag of S3 is a digest of the
 *  body, so that equal bytes have equal ETags. Retries of answers 500 and 503 are the SDK's, bounded by its settings.
 *  Throws TallypostError `store-refused`, `store-missing`, `store-unavailable`, `store-failed`, with the SDK's error as cause.
 *  Source: Amazon S3 User Guide, "Add preconditions to S3 operations with conditional requests". */
export function createS3Store({ client, bucket, prefix }: S3Place): Store {
  const root = prefix === '' ? '' : `${prefix.replace(/\/+$/, '')}/`;
  const place = `s3://${bucket}/${root}`.replace(/\/$/, '');
  const target = (key: string) => ({ Bucket: bucket, Key: root + key });

  /** Gives null for the expected statuses, by the status itself: the SDK has no stable name for a 304. */
  async function send<T>(
    key: string,
    request: () => Promise<T>,
    expected: readonly number[],
  ): Promise<T | number> {
    try {
      return await request();
    } catch (error) {
      const status = statusOf(error);
      // A bucket that is not there answers 404 as well, but says so in its name.
      if (status !== undefined && expected.includes(status) && nameOf(error) !== 'NoSuchBucket')
        return status;
      throw asStoreError(`${place}/${key}`, error);
    }
  }

  async function headOf(key: string): Promise<ObjectHead | null> {
    const answer = await send(key, () => client.send(new HeadObjectCommand(target(key))), [404]);
    return typeof answer === 'number' ? null : toHead(key, answer);
  }

  return {
    place,

    async get(key, options = {}) {
      checkKey(key);
      const input = {
        ...target(key),
        ...(options.ifNoneMatch === undefined ? {} : { IfNoneMatch: options.ifNoneMatch }),
      };
      const answer = await send(key, () => client.send(new GetObjectCommand(input)), [304, 404]);
      if (answer === 304) return { kind: 'not-modified' };
      if (typeof answer === 'number') return { kind: 'missing' };
      const head = toHead(key, answer);
      try {
        checkSize(key, head.bytes, options.bytesMax);
      } catch (error) {
        abandon(answer);
        throw error;
      }
      const body = await send(
        key,
        async () => (await answer.Body?.transformToByteArray()) ?? new Uint8Array(0),
        [],
      );
      return { kind: 'found', object: { ...head, body: body as Uint8Array } };
    },

    async stream(key) {
      checkKey(key);
      const answer = await send(key, () => client.send(new GetObjectCommand(target(key))), [404]);
      if (typeof answer === 'number') return null;
      return { head: toHead(key, answer), chunks: chunksOfAnswer(`${place}/${key}`, answer) };
    },

    async head(key) {
      checkKey(key);
      return headOf(key);
    },

    async put(key: string, body: Uint8Array, options: PutOptions = {}): Promise<PutResult> {
      checkKey(key);
      checkMetadata(key, options.metadata ?? {});
      const input = {
        ...target(key),
        Body: body,
        ContentType: options.contentType ?? contentTypeOf(key),
        ...(options.metadata === undefined ? {} : { Metadata: { ...options.metadata } }),
        ...(options.ifMatch === undefined ? {} : { IfMatch: options.ifMatch }),
        ...(options.ifNoneMatch === undefined ? {} : { IfNoneMatch: options.ifNoneMatch }),
      };
      // 412: the condition did not hold, or this very write landed, its answer was lost and the SDK sent it again.
      // 409: another write ran at the same time. 404: If-Match on an object that is gone.
      const isConditional = options.ifMatch !== undefined || options.ifNoneMatch !== undefined;
      const answer = await send(
        key,
        () => client.send(new PutObjectCommand(input)),
        isConditional ? [404, 409, 412] : [],
      );
      if (typeof answer === 'number') return { kind: 'lost' };
      return { kind: 'written', etag: answer.ETag ?? '' };
    },

    async *list(listed, options = {}) {
      let token: string | undefined;
      do {
        const input = {
          Bucket: bucket,
          Prefix: root + listed,
          // Some characters that a key may hold cannot stand in XML.
          EncodingType: 'url' as const,
          ...(options.after === undefined ? {} : { StartAfter: root + options.after }),
          ...(token === undefined ? {} : { ContinuationToken: token }),
        };
        const page = await send(listed, () => client.send(new ListObjectsV2Command(input)), []);
        if (typeof page === 'number') return;
        for (const { Key, ETag, Size, LastModified } of page.Contents ?? []) {
          const key = decodeURIComponent((Key ?? '').replaceAll('+', ' ')).slice(root.length);
          // The console makes empty objects that stand for folders.
          if (key === '' || key.endsWith('/')) continue;
          yield { key, etag: ETag ?? '', bytes: Size ?? 0, modifiedAtMs: LastModified?.getTime() ?? 0 };
        }
        token = page.IsTruncated ? page.NextContinuationToken : undefined;
      } while (token !== undefined);
    },

    async delete(key, { ifMatch } = {}) {
      checkKey(key);
      // 412: it changed. 409: another request of this key ran at the same time, and may have changed it.
      // Source: Amazon S3 User Guide, "How to perform conditional deletes".
      const input = { ...target(key), ...(ifMatch === undefined ? {} : { IfMatch: ifMatch }) };
      const expected = ifMatch === undefined ? [404] : [404, 409, 412];
      await send(key, () => client.send(new DeleteObjectCommand(input)), expected);
    },

    async replaceMetadata(key, metadata, options) {
      checkKey(key);
      checkMetadata(key, metadata);
      // A copy that replaces metadata drops the content type unless it is sent again.
      const old = await headOf(key);
      if (old === null) return { kind: 'missing' };
      if (old.etag !== options.ifMatch) return { kind: 'lost' };
      const input = {
        ...target(key),
        CopySource: `${bucket}/${(root + key).split('/').map(encodeURIComponent).join('/')}`,
        CopySourceIfMatch: options.ifMatch,
        IfMatch: options.ifMatch,
        MetadataDirective: 'REPLACE' as const,
        Metadata: { ...metadata },
        ContentType: old.contentType,
      };
      const answer = await send(key, () => client.send(new CopyObjectCommand(input)), [404, 409, 412]);
      if (answer === 404) return { kind: 'missing' };
      if (typeof answer === 'number') return { kind: 'lost' };
      return { kind: 'written', etag: answer.CopyObjectResult?.ETag ?? '' };
    },
  };
}

interface HeadFields {
  readonly ETag?: string | undefined;
  readonly ContentLength?: number | undefined;
  readonly LastModified?: Date | undefined;
  readonly ContentType?: string | undefined;
  readonly Metadata?: Record<string, string> | undefined;
}

function toHead(key: string, answer: HeadFields): ObjectHead {
  return {
    key,
    etag: answer.ETag ?? '',
    bytes: answer.ContentLength ?? 0,
    modifiedAtMs: answer.LastModified?.getTime() ?? 0,
    contentType: answer.ContentType ?? 'application/octet-stream',
    metadata: answer.Metadata ?? {},
  };
}

/** The body of an answer in pieces of bounded size. */
async function* chunksOfAnswer(place: string, answer: GetObjectCommandOutput): AsyncIterable<Uint8Array> {
  try {
    for await (const piece of (answer.Body ?? []) as AsyncIterable<Uint8Array>) {
      for (let at = 0; at < piece.length; at += bounds.streamChunkBytesMax)
        yield piece.subarray(at, at + bounds.streamChunkBytesMax);
    }
  } catch (error) {
    throw asStoreError(place, error);
  } finally {
    abandon(answer);
  }
}

/** Gives the connection back although the body was not read to its end. */
function abandon(answer: GetObjectCommandOutput): void {
  (answer.Body as { destroy?: () => void } | undefined)?.destroy?.();
}

const statusOf = (error: unknown): number | undefined =>
  (error as { $metadata?: { httpStatusCode?: number } } | null)?.$metadata?.httpStatusCode;
const nameOf = (error: unknown): string => (error as { name?: string } | null)?.name ?? 'unknown';

function asStoreError(place: string, error: unknown): unknown {
  if (error instanceof TallypostError) return error;
  const status = statusOf(error);
  const got = status === undefined ? nameOf(error) : `${status} ${nameOf(error)}`;
  if (status === 401 || status === 403)
    return new TallypostError(
      { code: 'store-refused', place, expected: 'permission for this request', got },
      error,
    );
  if (nameOf(error) === 'NoSuchBucket')
    return new TallypostError(
      { code: 'store-missing', place, expected: 'a bucket of this name', got },
      error,
    );
  if (status === undefined || status >= 500 || status === 429)
    return new TallypostError(
      { code: 'store-unavailable', place, expected: 'an answer from the store', got },
      error,
    );
  return new TallypostError(
    { code: 'store-failed', place, expected: 'the request to be accepted', got },
    error,
  );
}
