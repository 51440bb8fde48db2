import { bounds } from '../bounds.ts';
import { type CompactionResult, compact } from '../ledger/compaction.ts';
import { type RecountResult, recount } from '../ledger/recount.ts';
import { measureCompaction, measureRecount } from '../metrics/measurement.ts';
import { keys } from '../store/keys.ts';
import type { EventObject } from './event-objects.ts';
import { foldDrops } from './fold-drops.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { createDeskOpener, type OpenDesk } from './workbench.ts';

export interface CompactResult {
  readonly compaction: CompactionResult;
  /** Drops that had lain for over an hour: how many are done with now, and how many remain. */
  readonly leftDrops: { readonly done: number; readonly remaining: number };
  /** Null when the event did not ask for it, or when there are too many histories for a function's time. */
  readonly recount: (Pick<RecountResult, 'messages' | 'fault'> & { readonly differences: number }) | null;
}

/** Folds what `confirm` left lying, then makes a new base. Any event starts it; of two at once one gives way. An event with
 *  `"recount": true` also counts every history again and compares: one read a confirmed message, within the function's time.
 *  Throws what stopped the compaction, so that the schedule's retries and alarms see it. */
export function createCompactHandler(deps: HandlerDeps): (event: unknown) => Promise<CompactResult> {
  const openDesk = createDeskOpener(deps);
  return async (event) => {
    const startedMs = deps.world.nowMs();
    try {
      const open = await openDesk();
      const left = await leftDrops(deps);
      let done = 0;
      for (let at = 0; at < left.length; at += bounds.foldDropsMax) {
        const areDone = await foldDrops(deps, open, left.slice(at, at + bounds.foldDropsMax));
        done += areDone.filter(Boolean).length;
      }
      const compaction = await compact(deps.world, open.desk, open.extractor.schema);
      const tookMs = deps.world.nowMs() - startedMs;
      deps.measure?.(measureCompaction(compaction, tookMs));
      const recounted = isRecountAsked(event) ? await recountNow(deps, open) : null;
      const result = { compaction, leftDrops: { done, remaining: left.length - done }, recount: recounted };
      deps.log({ level: 'info', event: 'compaction', tookMs, ...result });
      return result;
    } catch (error) {
      deps.log({ level: 'error', event: 'compaction-failed', ...faultMembers(error) });
      throw error;
    }
  };
}

function isRecountAsked(event: unknown): boolean {
  return typeof event === 'object' && event !== null && (event as { recount?: unknown }).recount === true;
}

async function recountNow(
  deps: HandlerDeps,
  { desk, extractor }: OpenDesk,
): Promise<CompactResult['recount']> {
  if (!(await isRecountable(deps))) {
    deps.log({ level: 'warn', event: 'recount-skipped', historiesMax: bounds.functionRecountMax });
    return null;
  }
  const { messages, fault, differences } = await recount(deps.world, desk, extractor.schema);
  const recounted = { messages, fault, differences: differences.length };
  deps.measure?.(measureRecount(recounted));
  if (fault !== null || differences.length > 0)
    deps.log({ level: 'error', event: 'recount-differs', ...recounted });
  return recounted;
}

/** A listing costs a thousandth of the recount. */
async function isRecountable({ world }: HandlerDeps): Promise<boolean> {
  let histories = 0;
  for await (const _ of world.store.list(keys.histories)) {
    histories += 1;
    if (histories > bounds.functionRecountMax) return false;
  }
  return true;
}

/** An event is lost at times, and dead letters are looked at late: what lies for an hour has missed its own. */
async function leftDrops({ world }: HandlerDeps): Promise<EventObject[]> {
  const left: EventObject[] = [];
  const beforeMs = world.nowMs() - bounds.leftDropAgeMs;
  for await (const { key, modifiedAtMs } of world.store.list(keys.confirmations)) {
    if (modifiedAtMs < beforeMs) left.push({ key, trace: '' });
    if (left.length >= bounds.leftDropsMax) break;
  }
  return left;
}
