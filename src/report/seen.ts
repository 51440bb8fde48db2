/** One message as the report looks at it: what was decided, and what people said. */
export interface Seen {
  readonly message: string;
  readonly atMs: number;
  readonly kind: 'routed' | 'held' | 'guarded';
  /** Decided or likeliest queue; null when nothing was known. */
  readonly queue: string | null;
  readonly posterior: number;
  readonly confirmed: SeenConfirmation | null;
  /** A person said something else before. */
  readonly isRevised: boolean;
}

export interface SeenConfirmation {
  readonly queue: string;
  readonly by: string;
  readonly at: string;
}

/** Decided with a probability, and confirmed since. */
export interface Judged extends Seen {
  readonly queue: string;
  readonly confirmed: SeenConfirmation;
}

export function judged(seen: readonly Seen[]): Judged[] {
  return seen.filter(
    (each): each is Judged => each.kind !== 'guarded' && each.queue !== null && each.confirmed !== null,
  );
}
