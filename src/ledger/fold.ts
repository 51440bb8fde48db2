import type { Desk } from '../desk/desk.ts';
import type { Schema } from '../features/schema.ts';
import type { Claim, FoldOutcome, World } from './world.ts';

/** Folds confirmations into the counts, exactly once each. One outcome a claim, in order. One write for each message whose
 *  history changes, and two for the batch. Never throws for a failing store: such claims are answered with `retry`. */
export declare function foldClaims(
  world: World,
  desk: Desk,
  schema: Schema,
  claims: readonly Claim[],
): Promise<FoldOutcome[]>;
