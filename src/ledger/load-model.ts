import type { Desk } from '../desk/desk.ts';
import type { Fault } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import type { Scorer } from '../model/scorer.ts';
import type { World } from './world.ts';

/** One committed state of the model, whole. */
export interface LoadedModel {
  /** Of the manifest; 0 when nothing was ever committed. */
  readonly version: number;
  readonly scorer: Scorer;
  /** No confirmed message in it: hold everything. */
  readonly isEmpty: boolean;
  /** The desk as of this version: queues that were renamed, merged or retired are replaced. Decide with this one. */
  readonly desk: Desk;
  /** Why there is a model that cannot be used (it counts another schema); null otherwise. `isEmpty` is true then. */
  readonly fault: Fault | null;
}

/** The model as last committed; `cached` itself when nothing changed, for one conditional read. */
export declare function loadModel(
  world: World,
  desk: Desk,
  schema: Schema,
  cached: LoadedModel | null,
): Promise<LoadedModel>;
