import type { Confirmation } from '../../src/ledger/world.ts';

/** What must stand where, worked out from what was delivered, acknowledged, undone, erased and restored, and in which order;
 *  never from what the ledger stored. Where two of these overlap in time, both orders are allowed. */

/** A confirmation as the desk sees it. Times are places in the order of all events of the run. */
export interface Delivered {
  readonly confirmation: Confirmation;
  /** First handed to a folder. */
  startedAt: number | null;
  /** First answered as in the counts, or as outranked. */
  acknowledgedAt: number | null;
}

export interface Undo {
  readonly by: string;
  readonly sinceMs: number;
  readonly untilMs: number;
  readonly startedAt: number;
  endedAt: number | null;
}

export interface Restored {
  readonly at: number;
  /** When the version that it returned to was committed. */
  readonly toAt: number;
}

type Fate = 'live' | 'out' | 'either';

export class Oracle {
  readonly delivered: Delivered[] = [];
  readonly undos: Undo[] = [];
  readonly restores: Restored[] = [];
  readonly erasureStarted = new Set<string>();
  /** Written down: to be done in the end, whoever crashes. */
  readonly erasureOrdered = new Set<string>();
  /** Known to be done. */
  readonly erased = new Set<string>();
  #now = 0;

  tick(): number {
    this.#now += 1;
    return this.#now;
  }

  /** Columns under which the message may stand now; null stands for none. */
  allowed(message: string): Set<string | null> {
    if (this.erased.has(message)) return new Set([null]);
    const own = this.delivered.filter((d) => d.confirmation.message === message && d.startedAt !== null);
    const fates = own.map((d) => ({ d, fate: this.fateOf(d) }));
    let best: Delivered | null = null;
    for (const { d, fate } of fates) if (fate === 'live' && (best === null || ranksAbove(d, best))) best = d;
    const allowed = new Set<string | null>();
    for (const { d, fate } of fates)
      if (fate !== 'out' && (best === null || d === best || ranksAbove(d, best)))
        allowed.add(columnOf(d.confirmation));
    if (best === null || this.erasureStarted.has(message)) allowed.add(null);
    return allowed;
  }

  fateOf(d: Delivered): Fate {
    if (d.acknowledgedAt === null) return 'either';
    const fates = [
      ...this.restores.map((r) => this.#afterRestore(d, r)),
      ...this.undos.filter((u) => isInScope(d, u)).map((u) => this.#afterUndo(d, u)),
    ];
    return fates.includes('out') ? 'out' : fates.includes('either') ? 'either' : 'live';
  }

  #afterRestore(d: Delivered, { at, toAt }: Restored): Fate {
    const [startedAt, acknowledgedAt] = [d.startedAt as number, d.acknowledgedAt as number];
    if (acknowledgedAt < toAt || startedAt > at) return 'live';
    if (startedAt <= toAt || acknowledgedAt > at) return 'either';
    // What changed nothing in the counts, since it was outranked or said the same, is not taken back.
    const others = this.delivered.filter((o) => o !== d && o.confirmation.message === d.confirmation.message);
    const mayHaveCovered = (o: Delivered) =>
      ranksAbove(o, d) || columnOf(o.confirmation) === columnOf(d.confirmation);
    return others.some((o) => o.startedAt !== null && mayHaveCovered(o)) ? 'either' : 'out';
  }

  #afterUndo(d: Delivered, undo: Undo): Fate {
    if (undo.endedAt !== null && (d.startedAt as number) > undo.endedAt) return 'live';
    if (undo.endedAt === null || (d.acknowledgedAt as number) > undo.startedAt) return 'either';
    // Taken back for certain, unless a restore took the undo back.
    const fates = this.restores
      .filter((r) => r.at > undo.startedAt)
      .map((r) =>
        (undo.endedAt as number) <= r.toAt
          ? 'out'
          : undo.startedAt > r.toAt && (undo.endedAt as number) < r.at
            ? 'live'
            : 'either',
      );
    return fates.includes('either') ? 'either' : fates.includes('live') ? 'live' : 'out';
  }
}

function isInScope({ confirmation }: Delivered, undo: Undo): boolean {
  const ms = Date.parse(confirmation.at);
  return confirmation.by === undo.by && ms >= undo.sinceMs && ms < undo.untilMs;
}

/** Newest first; of the same time the later name, then the later queue. */
function ranksAbove(a: Delivered, b: Delivered): boolean {
  const key = ({ confirmation: { at, by, queue } }: Delivered) => `${at} ${by} ${queue}`;
  return key(a) > key(b);
}

export function columnOf({ queue, at }: Pick<Confirmation, 'queue' | 'at'>): string {
  return `${queue}@${Math.floor(Date.parse(at) / (7 * 24 * 3600 * 1000))}`;
}
