import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import { readDesk } from '../desk/read-desk.ts';
import { TallypostError } from '../errors.ts';
import type { World } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';

/** Loads the desk's file and keeps it: looked at again after `deskFreshMs` at the earliest, read again only when it changed,
 *  so that a batch with nothing new costs no request here. The same object as long as the file is the same.
 *  Rejects with TallypostError `desk-missing`, or what readDesk throws; a file that breaks is never half used. */
export function createDeskLoader(world: World, freshMs: number = bounds.deskFreshMs): () => Promise<Desk> {
  let known: { readonly desk: Desk; readonly etag: string } | null = null;
  let lookedAtMs = Number.NEGATIVE_INFINITY;
  return async () => {
    const nowMs = world.nowMs();
    if (known !== null && nowMs - lookedAtMs < freshMs) return known.desk;
    const got = await world.store.get(keys.desk, known === null ? {} : { ifNoneMatch: known.etag });
    if (got.kind === 'missing') {
      throw new TallypostError({
        code: 'desk-missing',
        place: `${world.store.place}/${keys.desk}`,
        expected: 'the desk’s file',
        got: 'nothing',
      });
    }
    if (got.kind === 'found') known = { desk: readDesk(got.object.body, keys.desk), etag: got.object.etag };
    lookedAtMs = nowMs;
    return known!.desk;
  };
}
