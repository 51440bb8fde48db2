import { TallypostError } from '../errors.ts';
import { createDirectoryStore } from './directory.ts';
import type { Store } from './store.ts';

/** Opens `s3://bucket/prefix`, or a directory (made when it is not there). Region, credentials and endpoint come from
 *  the environment as the AWS SDK reads them; another server's endpoint is addressed by path.
 *  Throws TallypostError `place-refused`. The SDK is loaded only for S3: it costs 0.2 s. */
export async function openStore(place: string): Promise<Store> {
  if (!/^[a-z0-9]+:\/\//i.test(place)) return createDirectoryStore(place);
  const match = /^s3:\/\/([a-z0-9][a-z0-9.-]{1,61}[a-z0-9])(?:\/(.*))?$/.exec(place);
  if (match === null)
    throw new TallypostError({
      code: 'place-refused',
      place,
      expected: 'a directory or s3://bucket/prefix',
      got: place.startsWith('s3:') ? 'an invalid bucket name' : 'another scheme',
    });
  const [{ S3Client }, { createS3Store }] = await Promise.all([
    import('@aws-sdk/client-s3'),
    import('./s3.ts'),
  ]);
  const endpoint = process.env.AWS_ENDPOINT_URL_S3 ?? process.env.AWS_ENDPOINT_URL;
  const client = new S3Client(endpoint ? { forcePathStyle: true } : {});
  return createS3Store({ client, bucket: match[1] as string, prefix: match[2] ?? '' });
}
