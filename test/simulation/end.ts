import { bounds } from '../../src/bounds.ts';
import { compact } from '../../src/ledger/compaction.ts';
import { encodeCounts } from '../../src/model/codec-counts.ts';
import type { Entry } from '../../src/model/counts.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { desk, featuresOf, schema, tokenOf } from '../ledger/fixture.ts';
import { tokensIn } from '../ledger/tokens-in.ts';
import { compareRecount, fitModel, foldDrops, route, said } from './actors.ts';
import { fail } from './checker.ts';
import type { Simulation } from './simulation.ts';

/** Faults are over. Whatever crashed processes left must not stand in the way: every confirmation is delivered until it is
 *  acknowledged, compactions run, the horizon passes; then everything is compared. */
export async function checkEnd(simulation: Simulation): Promise<void> {
  const { oracle, scheduler, checker, objects } = simulation;
  const compactNow = () =>
    simulation.perform('compact', (world) => compact(world, desk, schema, { fitModel }));

  for (let round = 0; round < 5; round++) {
    const left = oracle.delivered.filter((d) => d.acknowledgedAt === null);
    if (left.length === 0) break;
    scheduler.nowMs += bounds.foldPatienceMs + 7 * 24 * 3600_000;
    await simulation.perform('fold', (world) => foldDrops(simulation, world, left));
  }
  const lost = oracle.delivered.filter((d) => d.acknowledgedAt === null);
  if (lost.length > 0) fail(`${lost.length} confirmations are never acknowledged`);

  // Old enough for what crashed processes began to be taken over, whatever their clocks said.
  scheduler.nowMs += bounds.foldPatienceMs + 7 * 24 * 3600_000;
  await compactNow();
  // With clocks that agree, one compaction is enough; others may have named something of their future.
  if (simulation.plan.skewMsMax === 0)
    for (const message of oracle.erasureOrdered) checkErased(simulation, message);
  scheduler.nowMs += bounds.horizonMs + 7 * 24 * 3600_000;
  await compactNow();
  const order = objects.keys('model/orders/').find((key) => objects.held.get(key)?.body.length !== 0);
  if (order) fail(`${order} is never carried out`);

  for (const message of oracle.erasureOrdered) checkErased(simulation, message);
  const standings = checker.standings();
  for (const message of simulation.plan.messages) {
    const column = standings.get(message) ?? null;
    if (!oracle.allowed(message).has(column)) fail(`in the end ${message} stands under ${column}`);
  }
  checkCells(simulation, standings);
  checkUnnamedGone(simulation);
  const counted = await simulation.perform('recount', compareRecount);
  if (counted !== standings.size) fail(`the recount counts ${counted} messages, not ${standings.size}`);
  await simulation.perform('route', (world) => route(simulation, world, 1));
}

/** The base, byte for byte, is the one that has just these messages, each counted once from scratch. */
function checkCells({ objects }: Simulation, standings: ReadonlyMap<string, string>): void {
  const manifest = objects.held.get('model/manifest.json');
  if (!manifest) return;
  const { base, segments } = JSON.parse(new TextDecoder().decode(manifest.body));
  if (segments.length > 0) fail('segments are left after the last compaction');
  const entries = [...standings].map(([message, column]): Entry => {
    const [queue, epoch] = column.split('@');
    return { features: featuresOf(message), said, minus: null, plus: { queue, epoch: Number(epoch) } };
  });
  const expected = encodeCounts(foldEntries(emptyCounts(schema), entries));
  const got =
    base === null
      ? encodeCounts(emptyCounts(schema))
      : (objects.held.get(`model/bases/${base}`)?.body ?? new Uint8Array());
  if (Buffer.compare(expected, got) !== 0) fail('the base is not what counting from scratch gives');
}

/** Every object of the store, decoded where it is packed: neither the message's id nor its own token. */
function checkErased({ objects }: Simulation, message: string): void {
  const token = tokenOf(message);
  for (const [key, { body }] of objects.held) {
    if (Buffer.from(body).includes(message)) fail(`${key} names the erased ${message}`);
    const holds = tokensIn(key, body).includes(token);
    if (holds) fail(`${key} holds a token of the erased ${message}`);
  }
}

/** After the horizon nothing is left but what the manifest names. */
function checkUnnamedGone({ objects }: Simulation): void {
  const manifest = objects.held.get('model/manifest.json');
  if (!manifest) return;
  const { base, table, absorbed, oldestVersion } = JSON.parse(new TextDecoder().decode(manifest.body));
  const named = new Set([`model/bases/${base}`, `model/tables/${table}`, `model/absorbed/${absorbed}`]);
  const kept = objects.keys('model/versions/').filter((key) => Number(key.slice(15, 27)) >= oldestVersion);
  if (kept.length < objects.keys('model/versions/').length) fail('versions that cannot be restored are kept');
  if (kept.length > 0) return;
  for (const prefix of ['model/bases/', 'model/tables/', 'model/absorbed/', 'model/segments/'])
    for (const key of objects.keys(prefix))
      if (!named.has(key)) fail(`${key} is kept though nothing names it`);
}
