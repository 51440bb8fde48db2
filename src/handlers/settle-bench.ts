import type { Bench } from '../settle/likelihood.ts';
import type { HandlerDeps } from './handler-deps.ts';
import { createDeskOpener, createModelLoader } from './workbench.ts';

/** Desk and model as last committed, kept between calls: two conditional reads when nothing changed. */
export function createBenchOpener(deps: HandlerDeps): () => Promise<Bench> {
  const openDesk = createDeskOpener(deps);
  const load = createModelLoader(deps);
  return async () => {
    const open = await openDesk();
    const model = await load(open);
    return { desk: model.desk, extractor: open.extractor, model };
  };
}
