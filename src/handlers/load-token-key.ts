import { readTokenKey, writeTokenKey } from '../desk/token-key.ts';
import { TallypostError } from '../errors.ts';
import { keys } from '../store/keys.ts';
import type { Store } from '../store/store.ts';

/** The desk's token key: from `setting` (an environment variable) when given, else from the store; when there is none and
 *  `createRandom` is given, one is made and kept there. Of two processes that make one at the same time both use the first.
 *  Throws TallypostError `token-key-unreadable` or `token-key-missing`. */
export async function loadTokenKey(
  store: Store,
  setting: string | undefined,
  createRandom: (() => Uint8Array) | null,
): Promise<Uint8Array> {
  if (setting !== undefined && setting !== '') return readTokenKey(setting, 'TALLYPOST_TOKEN_KEY');
  const kept = await keyIn(store);
  if (kept !== null) return kept;
  if (createRandom !== null) {
    const made = new TextEncoder().encode(`${writeTokenKey(createRandom())}\n`);
    await store.put(keys.tokenKey, made, { ifNoneMatch: '*', contentType: 'text/plain' });
    const first = await keyIn(store);
    if (first !== null) return first;
  }
  throw new TallypostError({
    code: 'token-key-missing',
    place: `${store.place}/${keys.tokenKey}`,
    expected: '32 hex digits here or in TALLYPOST_TOKEN_KEY',
    got: 'nothing',
  });
}

async function keyIn(store: Store): Promise<Uint8Array | null> {
  const got = await store.get(keys.tokenKey, { bytesMax: 1024 });
  return got.kind === 'found' ? readTokenKey(new TextDecoder().decode(got.object.body), keys.tokenKey) : null;
}
