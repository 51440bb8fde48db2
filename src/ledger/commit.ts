import { bounds } from '../bounds.ts';
import { type Fault, TallypostError } from '../errors.ts';
import { keys } from '../store/keys.ts';
import { brokenRule, decodeManifest, emptyManifest, encodeManifest, type Manifest } from './manifest.ts';
import { faultOf, isLasting, isOfStore, pause } from './pace.ts';
import type { World } from './world.ts';

export interface ReadManifest {
  readonly manifest: Manifest;
  /** Null: nothing was ever committed. */
  readonly etag: string | null;
}

export async function readManifest(world: World): Promise<ReadManifest> {
  const got = await world.store.get(keys.manifest, { bytesMax: bounds.ledgerJsonBytesMax });
  if (got.kind !== 'found') return { manifest: emptyManifest, etag: null };
  return { manifest: decodeManifest(got.object.body, keys.manifest), etag: got.object.etag };
}

/** What to do about the manifest just read. */
export type Step<T> =
  /** There is nothing to write: it has happened already, or it cannot happen. */
  | { readonly kind: 'settled'; readonly value: T }
  /** Replace it. `gone`: the segments that this absorbs or rolls back; `back`: those in the base that it lists again. */
  | {
      readonly kind: 'write';
      readonly next: Manifest;
      readonly value: T;
      readonly gone?: ReadonlySet<string>;
      readonly back?: ReadonlySet<string>;
    };

export type Commit<T> =
  | { readonly kind: 'known'; readonly value: T; readonly manifest: Manifest }
  /** Attempts ran out; the change may or may not have happened, or may happen yet. */
  | { readonly kind: 'unknown'; readonly fault: Fault };

/** Changes the manifest by compare-and-set: read, decide, replace; on a lost race or a lost answer again, from reading.
 *  `decide` must look for its own effect (`hasTried`: an earlier attempt may have landed), since an answer may be lost.
 *  Throws TallypostError `invariant-broken` for a change that no change may make, and what `decide` throws. */
export async function commit<T>(
  world: World,
  decide: (manifest: Manifest, hasTried: boolean) => Promise<Step<T>>,
): Promise<Commit<T>> {
  let fault: Fault = { code: 'contended', place: keys.manifest, expected: 'a turn to write', got: 'none' };
  let hasTried = false;
  for (let attempt = 0; attempt < bounds.writeAttemptsMax; attempt++) {
    if (attempt > 0) await pause(world, attempt);
    try {
      const { manifest, etag } = await readManifest(world);
      const step = await decide(manifest, hasTried);
      if (step.kind === 'settled') return { kind: 'known', value: step.value, manifest };
      checkSuccession(manifest, step);
      hasTried = true;
      const condition = etag === null ? { ifNoneMatch: '*' as const } : { ifMatch: etag };
      const put = await world.store.put(keys.manifest, encodeManifest(step.next), condition);
      if (put.kind === 'written') return { kind: 'known', value: step.value, manifest: step.next };
    } catch (error) {
      if (!isOfStore(error)) throw error;
      fault = faultOf(error, keys.manifest);
      if (isLasting(fault)) break;
    }
  }
  return { kind: 'unknown', fault };
}

function checkSuccession(before: Manifest, { next, gone, back }: Step<unknown> & { kind: 'write' }): void {
  const rule = brokenRule(before, next, gone ?? new Set(), back ?? new Set());
  if (rule !== null)
    throw new TallypostError({
      code: 'invariant-broken',
      place: `${keys.manifest}, version ${before.version}`,
      expected: rule,
      got: 'a change against it',
    });
}
