import { Readable } from 'node:stream';
import type { S3Client } from '@aws-sdk/client-s3';
import { createMemoryStore } from '../../src/store/memory.ts';

/** What a request needs to be allowed. Source: Service Authorization Reference, "Actions, resources, and condition keys for
 *  Amazon S3"; Amazon S3 API Reference, CopyObject ("Permissions"); If-Match reads what it compares with. */
export const actionsOfCommand: Readonly<Record<string, readonly string[]>> = {
  GetObjectCommand: ['s3:GetObject'],
  HeadObjectCommand: ['s3:GetObject'],
  PutObjectCommand: ['s3:PutObject'],
  CopyObjectCommand: ['s3:GetObject', 's3:PutObject'],
  DeleteObjectCommand: ['s3:DeleteObject'],
  ListObjectsV2Command: ['s3:ListBucket'],
};

export interface Use {
  readonly action: string;
  /** The object's key; for s3:ListBucket the prefix listed, or the key that was not there. */
  readonly on: string;
}

interface Input {
  readonly Key: string;
  readonly Prefix: string;
  readonly Body?: Uint8Array;
  readonly ContentType?: string;
  readonly Metadata?: Record<string, string>;
  readonly IfMatch?: string;
  readonly IfNoneMatch?: string;
  readonly StartAfter?: string;
}

function refusal(status: number, name: string): Error {
  return Object.assign(new Error(name), { name, $metadata: { httpStatusCode: status } });
}

/** An S3 client over memory that tells `note` what each request needs. A creation for which `isAnswerLost` says so lands, and
 *  comes back as the refusal that the SDK's own retry then meets. */
export function createRecordingClient(
  note: (use: Use) => void,
  nowMs: () => number,
  isAnswerLost: (key: string) => boolean,
): S3Client {
  const store = createMemoryStore(nowMs);
  const missing = (key: string): Error => {
    // Without the right to list, S3 would answer 403: Amazon S3 API Reference, GetObject ("Permissions").
    note({ action: 's3:ListBucket', on: key });
    return refusal(404, 'NoSuchKey');
  };
  const headers = (head: {
    etag: string;
    bytes: number;
    modifiedAtMs: number;
    contentType: string;
    metadata: object;
  }) => ({
    ETag: head.etag,
    ContentLength: head.bytes,
    LastModified: new Date(head.modifiedAtMs),
    ContentType: head.contentType,
    Metadata: head.metadata,
  });

  async function answer(name: string, input: Input): Promise<unknown> {
    const key = input.Key;
    switch (name) {
      case 'GetObjectCommand': {
        const got = await store.get(
          key,
          input.IfNoneMatch === undefined ? {} : { ifNoneMatch: input.IfNoneMatch },
        );
        if (got.kind === 'missing') throw missing(key);
        if (got.kind === 'not-modified') throw refusal(304, 'Unknown');
        const { body } = got.object;
        const stream = Object.assign(Readable.from([body]), { transformToByteArray: async () => body });
        return { ...headers(got.object), Body: stream };
      }
      case 'HeadObjectCommand': {
        const head = await store.head(key);
        if (head === null) throw missing(key);
        return headers(head);
      }
      case 'PutObjectCommand': {
        if (input.IfMatch !== undefined) note({ action: 's3:GetObject', on: key });
        const put = await store.put(key, input.Body as Uint8Array, {
          ...(input.IfMatch === undefined ? {} : { ifMatch: input.IfMatch }),
          ...(input.IfNoneMatch === undefined ? {} : { ifNoneMatch: '*' as const }),
          ...(input.ContentType === undefined ? {} : { contentType: input.ContentType }),
          ...(input.Metadata === undefined ? {} : { metadata: input.Metadata }),
        });
        if (put.kind === 'lost' || (input.IfNoneMatch !== undefined && isAnswerLost(key)))
          throw refusal(412, 'PreconditionFailed');
        return { ETag: put.etag };
      }
      case 'CopyObjectCommand': {
        const copied = await store.replaceMetadata(key, input.Metadata ?? {}, {
          ifMatch: input.IfMatch as string,
        });
        if (copied.kind !== 'written') throw refusal(412, 'PreconditionFailed');
        return { CopyObjectResult: { ETag: copied.etag } };
      }
      case 'DeleteObjectCommand': {
        if (input.IfMatch === undefined) return store.delete(key);
        // Amazon S3 User Guide, "Enforce conditional deletes": with an ETag they need both rights.
        note({ action: 's3:GetObject', on: key });
        if ((await store.head(key))?.etag !== input.IfMatch) throw refusal(412, 'PreconditionFailed');
        return store.delete(key, { ifMatch: input.IfMatch });
      }
      case 'ListObjectsV2Command': {
        const Contents = [];
        for await (const item of store.list(
          input.Prefix,
          input.StartAfter === undefined ? {} : { after: input.StartAfter },
        ))
          Contents.push({
            Key: encodeURIComponent(item.key),
            ETag: item.etag,
            Size: item.bytes,
            LastModified: new Date(item.modifiedAtMs),
          });
        return { Contents, IsTruncated: false };
      }
      default:
        throw new Error(`a request that the tests do not know: ${name}`);
    }
  }

  const send = async (command: { input: Input }): Promise<unknown> => {
    const name = command.constructor.name;
    for (const action of actionsOfCommand[name] ?? [])
      note({ action, on: action === 's3:ListBucket' ? command.input.Prefix : command.input.Key });
    return answer(name, command.input);
  };
  return { send } as unknown as S3Client;
}
