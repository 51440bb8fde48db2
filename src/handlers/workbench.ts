import type { Desk } from '../desk/desk.ts';
import { TallypostError } from '../errors.ts';
import { createExtractor, type Extractor } from '../features/extractor.ts';
import { type LoadedModel, loadModel } from '../ledger/load-model.ts';
import { createScorer } from '../model/scorer.ts';
import { emptyTable } from '../model/served-table.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { faultMembers } from './log-fault.ts';

/** A desk with its extractor. */
export interface OpenDesk {
  readonly desk: Desk;
  readonly extractor: Extractor;
}

/** Keeps the extractor, with the hashes that it remembers, as long as the desk's file is the same. */
export function createDeskOpener(deps: HandlerDeps): () => Promise<OpenDesk> {
  let open: OpenDesk | null = null;
  return async () => {
    const desk = await deps.loadDesk();
    if (open?.desk !== desk) open = { desk, extractor: createExtractor(desk, deps.tokenKey) };
    return open;
  };
}

/** What messages are routed with. */
export interface Workbench extends OpenDesk {
  readonly model: Pick<LoadedModel, 'version' | 'scorer' | 'isEmpty' | 'fault'>;
  /** Segments beside the base; left out: not known. */
  readonly segments?: number;
}

/** Loads the model as last committed; keeps it, so that one conditional read is all when nothing changed. */
export function createModelLoader({ world }: HandlerDeps): (open: OpenDesk) => Promise<LoadedModel> {
  let cached: { readonly schema: string; readonly model: LoadedModel } | null = null;
  return async ({ desk, extractor: { schema } }) => {
    const last = cached?.schema === schema.id ? cached.model : null;
    const model = await loadModel(world, desk, schema, last);
    cached = { schema: schema.id, model };
    return model;
  };
}

/** Opens the desk with the model as last committed, kept between calls: one conditional read when nothing changed.
 *  A model that is damaged, or counts otherwise than the desk's file now says, does not stop routing: what this process last
 *  routed with serves on, and without it guards still act and everything else is held. Failures of the store reject: they
 *  may pass. */
export function createWorkbenchOpener(deps: HandlerDeps): () => Promise<Workbench> {
  const openDesk = createDeskOpener(deps);
  const load = createModelLoader(deps);
  let usable: Workbench | null = null;
  return async () => {
    const open = await openDesk();
    const { desk, extractor } = open;
    try {
      const model = await load(open);
      const segments = model.parts.manifest.segments.length;
      const bench: Workbench = { desk: model.desk, extractor, model, segments };
      if (model.fault === null) {
        usable = model.isEmpty ? null : bench;
        return bench;
      }
      deps.log({ level: 'error', event: 'model-unusable', ...model.fault });
      return usable ?? bench;
    } catch (error) {
      if (!(error instanceof TallypostError) || error.code.startsWith('store-')) throw error;
      deps.log({ level: 'error', event: 'model-unusable', ...faultMembers(error) });
      return usable ?? { desk, extractor, model: nothingLearned(desk, extractor, error) };
    }
  };
}

function nothingLearned(desk: Desk, { schema }: Extractor, fault: TallypostError): Workbench['model'] {
  const queues = desk.queues.map((queue) => queue.id);
  const scorer = createScorer(emptyTable(schema), [], queues, desk.halfLifeDays);
  return { version: 0, scorer, isEmpty: true, fault };
}
