/** What becomes of a message. */
export type Decision =
  | {
      readonly kind: 'routed';
      readonly queue: string;
      readonly posterior: number;
      readonly expectedMinutes: number;
      readonly isAudit: boolean;
    }
  | {
      readonly kind: 'held';
      readonly queue: string | null;
      readonly posterior: number;
      readonly reason: HoldReason;
    }
  | { readonly kind: 'guarded'; readonly queue: string; readonly posterior: number; readonly guard: string };

/** Why a person must look. */
export type HoldReason =
  | 'unsure'
  | 'unlike-anything-seen'
  | 'nothing-learned'
  | 'model-unusable'
  | 'unreadable'
  | 'suspect'
  | 'automatic';
