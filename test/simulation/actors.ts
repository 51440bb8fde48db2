import { compact } from '../../src/ledger/compaction.ts';
import { eraseMessages } from '../../src/ledger/erase.ts';
import { foldClaims } from '../../src/ledger/fold.ts';
import { type LoadedModel, loadModel } from '../../src/ledger/load-model.ts';
import { changeQueue } from '../../src/ledger/queues.ts';
import { recount } from '../../src/ledger/recount.ts';
import { restoreVersion } from '../../src/ledger/restore.ts';
import { undoConfirmations } from '../../src/ledger/undo.ts';
import type { Claim, World } from '../../src/ledger/world.ts';
import { desk, featuresOf, schema } from '../ledger/fixture.ts';
import { fail } from './checker.ts';
import type { Delivered } from './oracle.ts';
import type { Job } from './plan.ts';
import type { Simulation } from './simulation.ts';

/** What the processes of a run do, each with what must hold of the answers. */

/** Fitting is no part of the protocol. */
export const fitModel = ((_counts: unknown, _sample: unknown, last: unknown) => last) as never;

export const said = { queue: desk.queues[0].id, posterior: 0.6, isAudit: false };

export async function work(simulation: Simulation, world: World, job: Job): Promise<unknown> {
  switch (job.kind) {
    case 'fold':
      return foldDrops(simulation, world, job.drops);
    case 'route':
      return route(simulation, world);
    case 'compact':
      return tolerant(() => compact(world, desk, schema, { fitModel }));
    case 'recount':
      return compareRecount(world);
    case 'restore': {
      const to = Math.max(0, simulation.checker.version - Math.floor(world.random() * 8));
      return tolerant(() => restoreVersion(world, desk, schema, to));
    }
    case 'erase':
      return erase(simulation, world, job.message);
    case 'undo':
      return tolerant(() => undoConfirmations(world, schema, job));
    case 'queue':
      return tolerant(() => changeQueue(world, desk, schema, job.change));
  }
}

export async function foldDrops(
  { oracle, plan }: Simulation,
  world: World,
  drops: readonly Delivered[],
): Promise<void> {
  const claims = drops.map(
    ({ confirmation }): Claim => ({ confirmation, features: featuresOf(confirmation.message), said }),
  );
  for (const d of drops) d.startedAt ??= oracle.tick();
  const outcomes = await foldClaims(world, desk, schema, claims, { patienceMs: plan.patienceMs });
  outcomes.forEach((outcome, i) => {
    if (outcome.kind === 'retry') {
      if (!passing.has(outcome.fault.code))
        fail(`fold says ${outcome.fault.code}: ${outcome.fault.expected}`);
      return;
    }
    if (outcome.kind === 'refused') {
      if (outcome.fault.code !== 'message-erased') fail(`fold refuses: ${outcome.fault.code}`);
      if (!oracle.erasureStarted.has(drops[i].confirmation.message))
        fail('a tombstone of a message that nobody erased');
    }
    drops[i].acknowledgedAt ??= oracle.tick();
  });
}

export async function route({ checker }: Simulation, world: World, loads = 4): Promise<void> {
  let model: LoadedModel | null = null;
  for (let i = 0; i < loads; i++) {
    const cached: LoadedModel | null = model;
    model = (await tolerant(() => loadModel(world, desk, schema, cached))) ?? model;
    if (model === null) continue;
    const { version, scorer } = model;
    const totals = checker.totals.get(version) ?? fail(`a router holds version ${version}, which never was`);
    scorer.queues.forEach((queue, k) => {
      const [got, expected] = [scorer.messages[k], totals.get(queue) ?? 0];
      if (got !== expected) fail(`a router of version ${version} counts ${got} of ${queue}, not ${expected}`);
    });
  }
}

/** Gives the messages counted; null when the store failed. */
export async function compareRecount(world: World): Promise<number | null> {
  const result = await tolerant(() => recount(world, desk, schema));
  if (result === null) return null;
  if (result.fault?.code === 'contended') return null;
  if (result.fault) fail(`the recount cannot read the table: ${result.fault.code}`);
  const [first] = result.differences;
  if (first) fail(`version ${result.version}: ${first.cell}: table ${first.left}, recount ${first.right}`);
  return result.messages;
}

async function erase({ oracle }: Simulation, world: World, message: string): Promise<void> {
  oracle.erasureStarted.add(message);
  const result = await tolerant(() => eraseMessages(world, schema, [message]));
  if (result?.isDone) oracle.erased.add(message);
}

/** Answers that a failing or busy store explains. */
const passing = new Set(['store-failed', 'store-busy', 'contended', 'being-folded', 'object-missing']);
const allowedErrors = new Set([...passing, 'version-unknown', 'queue-refused']);

/** An operation may fail while the store does; whatever else it throws must not happen. Null: it failed. */
export async function tolerant<T>(operation: () => Promise<T>): Promise<T | null> {
  try {
    return await operation();
  } catch (error) {
    const { code, message } = error as { code?: string; message: string };
    if (code === undefined ? ['connection reset', 'timeout'].includes(message) : allowedErrors.has(code))
      return null;
    throw error;
  }
}
