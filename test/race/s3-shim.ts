import { CreateBucketCommand, HeadObjectCommand, S3Client } from '@aws-sdk/client-s3';

/** Where a real S3-protocol server answers; undefined: none. Set by .ci/run, or by hand after `s3-server.sh up`. */
export const endpoint = process.env.TALLYPOST_S3_ENDPOINT;

interface Request {
  method: string;
  headers: Record<string, string>;
}

/** A client for radosgw, which differs from Amazon S3 in ways that no product should know of. Seen with Ceph 16.2:
 *  it compares If-Match with the ETag without its quotes; it tells a copy's ETag without quotes; and it may answer 500 to the loser of a race of conditional
 *  writes, where Amazon S3 answers 409. (It ignores CopySourceIfMatch and If-Match on a copy: the store's own look at
 *  the ETag before the copy is all that guards there.) It also ignores If-Match on a deletion: a look before it stands in. */
export function createShimmedClient(at: string): S3Client {
  const client = new S3Client({
    endpoint: at,
    region: 'us-east-1',
    forcePathStyle: true,
    credentials: { accessKeyId: 'testkey', secretAccessKey: 'testsecret' },
    maxAttempts: 3,
  });
  client.middlewareStack.add(
    (next, context) => async (args) => {
      const { Bucket, Key, IfMatch } = args.input as { Bucket?: string; Key?: string; IfMatch?: string };
      if (context.commandName !== 'DeleteObjectCommand' || IfMatch === undefined) return next(args);
      const head = await client.send(new HeadObjectCommand({ Bucket, Key }));
      if (head.ETag !== IfMatch)
        throw Object.assign(new Error('PreconditionFailed'), {
          name: 'PreconditionFailed',
          $metadata: { httpStatusCode: 412 },
        });
      return next(args);
    },
    { step: 'initialize', name: 'deleteOnCondition' },
  );
  client.middlewareStack.add(
    (next) => async (args) => {
      const { headers } = args.request as Request;
      for (const name of Object.keys(headers))
        if (name.toLowerCase() === 'if-match') headers[name] = (headers[name] as string).replaceAll('"', '');
      return next(args);
    },
    { step: 'build', name: 'unquoteIfMatch' },
  );
  client.middlewareStack.add(
    (next) => async (args) => {
      try {
        const answer = await next(args);
        const copied = (answer.output as { CopyObjectResult?: { ETag?: string } }).CopyObjectResult;
        if (copied?.ETag !== undefined) copied.ETag = `"${copied.ETag.replaceAll('"', '')}"`;
        return answer;
      } catch (error) {
        const { method, headers } = args.request as Request;
        const isConditional = Object.keys(headers).some((name) => /^if-(none-)?match$/i.test(name));
        const metadata = (error as { $metadata?: { httpStatusCode?: number } }).$metadata;
        if (method === 'PUT' && isConditional && metadata?.httpStatusCode === 500)
          metadata.httpStatusCode = 409;
        throw error;
      }
    },
    // Before the SDK's retries look at the answer: Amazon's 409 is not repeated.
    { step: 'deserialize', name: 'answerAsAmazon', priority: 'high' },
  );
  return client;
}

/** Makes a bucket; gives its name. */
export async function makeBucket(client: S3Client): Promise<string> {
  const bucket = `race-${Date.now().toString(36)}-${Math.random().toString(36).slice(2, 8)}`;
  await client.send(new CreateBucketCommand({ Bucket: bucket }));
  return bucket;
}
