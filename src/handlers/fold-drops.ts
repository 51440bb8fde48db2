import { bounds } from '../bounds.ts';
import { type Fault, TallypostError } from '../errors.ts';
import { foldClaims } from '../ledger/fold.ts';
import { mapBounded } from '../ledger/pace.ts';
import type { Claim, Confirmation, FoldOutcome } from '../ledger/world.ts';
import { measureFolding } from '../metrics/measurement.ts';
import { keys } from '../store/keys.ts';
import type { ObjectHead } from '../store/store.ts';
import { claimOf, type ReadClaim } from './claim.ts';
import type { EventObject } from './event-objects.ts';
import { type HandlerDeps, keepLines } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { readDrop } from './read-drop.ts';
import { bytesUpTo } from './read-message.ts';
import type { OpenDesk } from './workbench.ts';

/** A drop as it was found. */
interface Drop extends EventObject {
  readonly etag: string;
  readonly body: Uint8Array;
}

type Taken =
  | { readonly kind: 'claim'; readonly drop: Drop; readonly read: ReadClaim }
  | { readonly kind: 'refused'; readonly drop: Drop; readonly fault: Fault }
  | { readonly kind: 'gone' }
  | { readonly kind: 'retry' };

/** Folds dropped confirmations, all in one batch; for each, in order, whether it is done with. A drop is deleted only once
 *  its confirmation is in the counts, or known never to come there: then it is kept under `confirmations-refused/` with the
 *  reason, so that it is neither lost nor tried for ever. */
export async function foldDrops(
  deps: HandlerDeps,
  { desk, extractor }: OpenDesk,
  objects: readonly EventObject[],
): Promise<boolean[]> {
  const taken = await mapBounded(objects, (object) => takeDrop(deps, extractor, object));
  const claims = taken.flatMap((each): Claim[] => (each.kind === 'claim' ? [each.read.claim] : []));
  const outcomes = claims.length === 0 ? [] : await foldClaims(deps.world, desk, extractor.schema, claims);
  let next = 0;
  const settled = taken.map((each) => ({ each, outcome: each.kind === 'claim' ? outcomes[next++]! : null }));
  const kept = keepLines(deps);
  const areDone = await mapBounded(settled, ({ each, outcome }) => settleDrop(kept.deps, each, outcome));
  deps.measure?.(measureFolding(kept.lines));
  return areDone;
}

/** Failures of the store may pass; whatever else is wrong with a drop stays. */
async function takeDrop(
  deps: HandlerDeps,
  extractor: OpenDesk['extractor'],
  object: EventObject,
): Promise<Taken> {
  const { key } = object;
  if (!key.startsWith(keys.confirmations)) return { kind: 'gone' };
  let drop: Drop | null = null;
  try {
    const found = await deps.world.store.stream(key);
    // Folded and deleted already: this delivery is a repetition.
    if (found === null) return { kind: 'gone' };
    const body = await bytesUpTo(found.chunks, bounds.dropBytesMax);
    drop = { ...object, etag: found.head.etag, body };
    checkSize(found.head);
    const read = await claimOf(deps.world, extractor, readDrop(drop.body, key));
    return { kind: 'claim', drop, read };
  } catch (error) {
    if (drop !== null && error instanceof TallypostError && !error.code.startsWith('store-')) {
      const { code, place, expected, got } = error;
      return { kind: 'refused', drop, fault: { code, place, expected, got } };
    }
    deps.log({
      level: 'error',
      event: 'confirmation-failed',
      drop: key,
      trace: object.trace,
      ...faultMembers(error),
    });
    return { kind: 'retry' };
  }
}

async function settleDrop(deps: HandlerDeps, taken: Taken, outcome: FoldOutcome | null): Promise<boolean> {
  if (taken.kind === 'gone') return true;
  if (taken.kind === 'retry') return false;
  const { drop } = taken;
  const trace = (taken.kind === 'claim' && taken.read.trace) || drop.trace;
  const fault = taken.kind === 'refused' ? taken.fault : outcome?.kind === 'refused' ? outcome.fault : null;
  try {
    if (fault !== null) {
      await keepRefused(deps, drop, fault);
      // What was there instead stands in the record kept: whoever made the drop may have put anything there.
      const { got: _, ...shown } = fault;
      deps.log({ level: 'warn', event: 'confirmation-refused', drop: drop.key, trace, ...shown });
    } else if (taken.kind === 'claim') {
      const { confirmation } = taken.read.claim;
      const line = { drop: drop.key, message: confirmation.message, trace };
      if (outcome!.kind === 'retry') {
        deps.log({ level: 'warn', event: 'confirmation-postponed', ...line, ...outcome!.fault });
        return false;
      }
      const lag = outcome!.kind === 'folded' ? lagOf(deps, confirmation) : {};
      deps.log({
        level: 'info',
        event: `confirmation-${outcome!.kind}`,
        ...line,
        queue: confirmation.queue,
        ...lag,
      });
    }
    // A drop that was replaced meanwhile is another confirmation, with an event of its own: it stays.
    await deps.world.store.delete(drop.key, { ifMatch: drop.etag });
    return true;
  } catch (error) {
    deps.log({
      level: 'error',
      event: 'confirmation-failed',
      drop: drop.key,
      trace,
      ...faultMembers(error),
    });
    return false;
  }
}

/** How long a confirmation waited for its fold; of archived mail it says nothing. */
function lagOf({ world }: HandlerDeps, { message, at }: Confirmation): { readonly lagMs?: number } {
  const isArchived = (keys.inbound + message).startsWith(keys.archive);
  return isArchived ? {} : { lagMs: world.nowMs() - Date.parse(at) };
}

function checkSize({ key, bytes }: ObjectHead): void {
  if (bytes <= bounds.dropBytesMax) return;
  throw new TallypostError({
    code: 'confirmation-too-large',
    place: key,
    expected: `at most ${bounds.dropBytesMax} bytes`,
    got: `${bytes} bytes`,
  });
}

/** The drop's own members beside what is wrong with them. */
async function keepRefused({ world }: HandlerDeps, { key, body, trace }: Drop, fault: Fault): Promise<void> {
  const text = new TextDecoder().decode(body);
  let drop: unknown = text;
  try {
    drop = JSON.parse(text);
  } catch {
    // Kept as the text that it is.
  }
  const record = { ...fault, refusedAt: new Date(world.nowMs()).toISOString(), trace, drop };
  const id = key.slice(keys.confirmations.length).replace(/\.json$/, '');
  await world.store.put(
    `${keys.refusedConfirmations}${id}.json`,
    Buffer.from(`${JSON.stringify(record, null, 2)}\n`),
  );
}
