import { bounds } from '../bounds.ts';
import { type CompactionResult, compact } from '../ledger/compaction.ts';
import { keys } from '../store/keys.ts';
import type { EventObject } from './event-objects.ts';
import { foldDrops } from './fold-drops.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';
import { createDeskOpener } from './workbench.ts';

export interface CompactResult {
  readonly compaction: CompactionResult;
  /** Drops that had lain for over an hour: how many are done with now, and how many remain. */
  readonly leftDrops: { readonly done: number; readonly remaining: number };
}

/** Folds what `confirm` left lying, then makes a new base. Any event starts it; of two at once one gives way.
 *  Throws what stopped the compaction, so that the schedule's retries and alarms see it. */
export function createCompactHandler(deps: HandlerDeps): (event: unknown) => Promise<CompactResult> {
  const openDesk = createDeskOpener(deps);
  return async () => {
    try {
      const open = await openDesk();
      const left = await leftDrops(deps);
      let done = 0;
      for (let at = 0; at < left.length; at += bounds.foldDropsMax) {
        const areDone = await foldDrops(deps, open, left.slice(at, at + bounds.foldDropsMax));
        done += areDone.filter(Boolean).length;
      }
      const compaction = await compact(deps.world, open.desk, open.extractor.schema);
      const result = { compaction, leftDrops: { done, remaining: left.length - done } };
      deps.log({ level: 'info', event: 'compaction', ...result });
      return result;
    } catch (error) {
      deps.log({ level: 'error', event: 'compaction-failed', ...faultMembers(error) });
      throw error;
    }
  };
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
