import { type LoadedModel, loadModel } from '../ledger/load-model.ts';
import type { Bench } from '../settle/likelihood.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { createDeskOpener } from './workbench.ts';

/** Desk and model as last committed, kept between calls: two conditional reads when nothing changed. */
export function createBenchOpener(deps: HandlerDeps): () => Promise<Bench> {
  const openDesk = createDeskOpener(deps);
  let cached: { readonly schema: string; readonly model: LoadedModel } | null = null;
  return async () => {
    const { desk, extractor } = await openDesk();
    const { schema } = extractor;
    const last = cached?.schema === schema.id ? cached.model : null;
    const model = await loadModel(deps.world, desk, schema, last);
    cached = { schema: schema.id, model };
    return { desk: model.desk, extractor, model };
  };
}
