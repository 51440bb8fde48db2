import { bounds } from '../bounds.ts';
import type { Fault } from '../errors.ts';
import type { Features } from '../features/schema.ts';
import type { Column, Said } from '../model/counts.ts';
import { isSameColumn } from '../model/fold.ts';
import {
  columnOf,
  type History,
  isSame,
  isTombstone,
  outranks,
  type Placement,
  type Recorded,
  type Settled,
  type Stored,
  standing,
} from './history.ts';
import { historyKey } from './history-store.ts';
import type { Confirmation } from './world.ts';

/** One thing to be done to a message's history. */
export type Request =
  | {
      readonly kind: 'confirm';
      readonly confirmation: Confirmation;
      readonly features: Features;
      /** `features` as histories keep them. */
      readonly encoded: string;
      readonly said: Said | null;
    }
  | {
      readonly kind: 'undo';
      readonly by: string;
      readonly sinceMs: number;
      readonly untilMs: number;
      readonly atMs: number;
    }
  | { readonly kind: 'erase'; readonly atMs: number };

/** What a request comes to, once the plan has landed. */
export type Answer =
  | { readonly kind: 'done'; readonly confirmations: number }
  | { readonly kind: 'already' }
  | { readonly kind: 'stale' }
  | { readonly kind: 'refused'; readonly fault: Fault };

export interface Move {
  readonly minus: Column | null;
  readonly plus: Column | null;
  readonly said: Said | null;
  /** It takes the message out for good. */
  readonly erases: boolean;
  /** As the history keeps them. */
  readonly encoded: string;
}

export interface Plan {
  /** The history to write; null: it is right as it is. */
  readonly next: Stored | null;
  /** What the segment must hold for this message: nothing when it leads from a column to the same; null: it needs no segment. */
  readonly move: Move | null;
  readonly answers: readonly Answer[];
}

/** What becomes of a message's history when `requests` are carried out with segment `segment`. The counts stand where the last
 *  landed placement says; whatever was placed in vain since falls away with its segment, so that one subtraction and one
 *  addition lead from there to the confirmation that now stands. `settled` must have nothing open. */
export function plan(
  message: string,
  stored: Stored | null,
  settled: Settled,
  requests: readonly Request[],
  segment: string,
  schema: string,
): Plan {
  if (stored !== null && isTombstone(stored))
    return { next: null, move: null, answers: requests.map((r) => answerErased(message, r)) };
  const draft = new Draft(message, stored, settled, schema);
  const answers = requests.map((request) => draft.carryOut(request));
  return { ...draft.finish(stored, segment), answers };
}

/** Who took a message out for good; no person's placement has no queue. */
const erase = 'erase';

/** Marks what belongs to the segment being made. */
const unstamped = '';

class Draft {
  readonly #message: string;
  #confirmations: Recorded[];
  readonly #schema: string;
  #features: Readonly<Record<string, string>>;
  #said: Said | null;
  #isErasing: boolean;
  readonly #landed: readonly Placement[];
  readonly #last: Placement | null;
  /** When it was last placed, also in vain: what takes over an undo or an erasure keeps its time. */
  readonly #placedAt: string;
  #erasedAt: string;
  #undoneAt: string | null = null;

  constructor(message: string, stored: History | null, settled: Settled, schema: string) {
    this.#message = message;
    this.#confirmations = settled.confirmations.map((c) => ({
      ...c,
      segment: settled.inVain.has(c.segment) ? unstamped : c.segment,
      ...(c.undone !== undefined && settled.inVain.has(c.undone) ? { undone: unstamped } : {}),
    }));
    this.#schema = schema;
    this.#features = stored?.features ?? {};
    this.#said = stored?.said ?? null;
    // Counted under another schema only: in this table the message stands nowhere.
    this.#landed = Object.hasOwn(this.#features, schema) ? settled.landed : [];
    this.#last = this.#landed.at(-1) ?? null;
    this.#isErasing = stored?.isErasing ?? false;
    this.#placedAt = stored?.placements.at(-1)?.at ?? '';
    this.#erasedAt = this.#placedAt;
  }

  carryOut(request: Request): Answer {
    if (request.kind === 'erase') return this.#erase(request.atMs);
    if (this.#isErasing) return answerErased(this.#message, request);
    return request.kind === 'confirm' ? this.#confirm(request) : this.#takeBack(request);
  }

  #confirm({
    confirmation: { queue, by, at },
    features,
    encoded,
    said,
  }: Request & { kind: 'confirm' }): Answer {
    const recorded: Recorded = { queue, by, at, segment: unstamped };
    if (this.#confirmations.length === 0) this.#said = said;
    if (!Object.hasOwn(this.#features, this.#schema))
      this.#features = { ...this.#features, [features.schema]: encoded };
    const known = this.#confirmations.find((c) => isSame(c, recorded));
    if (known)
      return known.segment === unstamped && known.undone === undefined ? done(1) : { kind: 'already' };
    if (this.#confirmations.length >= bounds.confirmationsPerMessageMax) return answerFull(this.#message);
    const top = standing(this.#confirmations);
    this.#confirmations.push(recorded);
    return top === null || outranks(recorded, top) ? done(1) : { kind: 'stale' };
  }

  #takeBack({ by, sinceMs, untilMs, atMs }: Request & { kind: 'undo' }): Answer {
    let count = 0;
    this.#confirmations = this.#confirmations.map((c) => {
      const ms = Date.parse(c.at);
      if (c.undone !== undefined || c.by !== by || ms < sinceMs || ms >= untilMs) return c;
      count += 1;
      return { ...c, undone: unstamped };
    });
    this.#undoneAt = new Date(atMs).toISOString();
    return count > 0 ? done(count) : { kind: 'already' };
  }

  #erase(atMs: number): Answer {
    this.#isErasing = true;
    this.#erasedAt = new Date(atMs).toISOString();
    return done(this.#confirmations.length);
  }

  finish(stored: History | null, segment: string): Omit<Plan, 'answers'> {
    const top = this.#isErasing ? null : standing(this.#confirmations);
    const [minus, plus] = [columnOf(this.#last), columnOf(top)];
    // Before its features go, an erasure has a segment of its own that landed, also where nothing is to be subtracted: from
    // then on no restore can bring the message back.
    const isErased = this.#isErasing && (this.#last === null || isErasure(this.#last));
    // So has what takes back: a confirmation that was outranked changes no count, yet a restore to before must bring it back.
    const takesBack = this.#confirmations.some((c) => c.undone === unstamped);
    const isMoved = this.#isErasing ? !isErased : takesBack || !isSameColumn(minus, plus);
    // Without a move, what is new is accounted for by the placement that stands already.
    const stamp = isMoved ? segment : (this.#last?.segment ?? unstamped);
    const confirmations = this.#confirmations.map((c) => ({
      ...c,
      segment: c.segment === unstamped ? stamp : c.segment,
      ...(c.undone === unstamped ? { undone: stamp } : {}),
    }));
    const placements = isMoved ? [...this.#landed, this.#placement(top, segment)] : this.#landed;
    if (isErased) return { next: this.#tombstone(stored), move: null };
    if (stored === null && confirmations.length === 0) return { next: null, move: null };
    const next: History = {
      format: 1,
      message: this.#message,
      rev: (stored?.rev ?? 0) + 1,
      features: this.#features,
      said: this.#said,
      confirmations,
      placements,
      isErasing: this.#isErasing,
    };
    const isAsStored =
      stored !== null && JSON.stringify({ ...next, rev: stored.rev }) === JSON.stringify(stored);
    return {
      next: isAsStored ? null : next,
      move: isMoved
        ? {
            minus,
            plus,
            said: this.#said,
            erases: this.#isErasing,
            encoded: this.#features[this.#schema] ?? '',
          }
        : null,
    };
  }

  #placement(top: Recorded | null, segment: string): Placement {
    if (top !== null) return { queue: top.queue, by: top.by, at: top.at, segment };
    if (this.#isErasing) return { queue: null, by: erase, at: this.#erasedAt, segment };
    return { queue: null, by: 'undo', at: this.#undoneAt ?? this.#placedAt, segment };
  }

  #tombstone(stored: History | null): Stored {
    return { format: 1, rev: (stored?.rev ?? 0) + 1, erasedAt: this.#erasedAt };
  }
}

function isErasure({ queue, by }: Placement): boolean {
  return queue === null && by === erase;
}

function done(confirmations: number): Answer {
  return { kind: 'done', confirmations };
}

function answerErased(message: string, request: Request): Answer {
  if (request.kind !== 'confirm') return { kind: 'already' };
  return {
    kind: 'refused',
    fault: { code: 'message-erased', place: historyKey(message), expected: 'a message', got: 'a tombstone' },
  };
}

function answerFull(message: string): Answer {
  return {
    kind: 'refused',
    fault: {
      code: 'confirmations-full',
      place: historyKey(message),
      expected: `at most ${bounds.confirmationsPerMessageMax} confirmations of one message`,
      got: 'one more',
    },
  };
}
