import { createDirectoryStore } from '../../src/store/directory.ts';
import type { Store } from '../../src/store/store.ts';

/** Where a race runs; passes between processes as JSON. */
export type Place =
  | { readonly kind: 'directory'; readonly path: string }
  | { readonly kind: 's3'; readonly endpoint: string; readonly bucket: string };

/** The SDK is loaded only where it is used: a process that is killed every few seconds must start quickly. */
export async function openPlace(place: Place): Promise<Store> {
  if (place.kind === 'directory') return createDirectoryStore(place.path);
  const [{ createS3Store }, { createShimmedClient }] = await Promise.all([
    import('../../src/store/s3.ts'),
    import('./s3-shim.ts'),
  ]);
  return createS3Store({ client: createShimmedClient(place.endpoint), bucket: place.bucket, prefix: 'desk' });
}
