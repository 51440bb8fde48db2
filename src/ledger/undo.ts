import { bounds } from '../bounds.ts';
import type { Fault } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { isTombstone } from './history.ts';
import { listMessages, readHistory } from './history-store.ts';
import { land, type Work } from './land.ts';
import { closeOrder, placeOrder, type UndoScope } from './orders.ts';
import { mapBounded } from './pace.ts';
import type { World } from './world.ts';

export interface UndoResult {
  readonly kind: 'undone' | 'unfinished' | 'dry-run';
  readonly messages: number;
  readonly confirmations: number;
  /** Nothing is left to do. */
  readonly isDone: boolean;
  readonly fault: Fault | null;
}

/** Takes back all confirmations of one person or import in a period. Each message falls back to its newest confirmation that
 *  is left, or out of the counts. A repeated delivery of what was taken back changes nothing. What a crash leaves undone
 *  is finished by the next compaction. Reads every history. */
export async function undoConfirmations(
  world: World,
  schema: Schema,
  scope: UndoScope,
  options: { readonly dryRun?: boolean } = {},
): Promise<UndoResult> {
  if (options.dryRun) {
    const found = (await findConcerned(world, scope)).filter((f) => f.confirmations > 0);
    const confirmations = found.reduce((sum, f) => sum + f.confirmations, 0);
    return { kind: 'dry-run', messages: found.length, confirmations, isDone: true, fault: null };
  }
  const atMs = world.nowMs();
  const { by, sinceMs, untilMs } = scope;
  const order = await placeOrder(world, { kind: 'undo', atMs, by, sinceMs, untilMs });
  const result = await carryOutUndo(world, schema, scope, atMs);
  if (result.isDone) await closeOrder(world, order);
  return result;
}

export async function carryOutUndo(
  world: World,
  schema: Schema,
  { by, sinceMs, untilMs }: UndoScope,
  atMs: number,
): Promise<UndoResult> {
  const found = await findConcerned(world, { by, sinceMs, untilMs });
  let [messages, confirmations] = [0, 0];
  let fault: Fault | null = null;
  for (let from = 0; from < found.length; from += bounds.recountChunkMax) {
    const works = found
      .slice(from, from + bounds.recountChunkMax)
      .map(({ message }): Work => ({ message, requests: [{ kind: 'undo', by, sinceMs, untilMs, atMs }] }));
    for (const landing of await land(world, schema, works, { patienceMs: 0 })) {
      if (landing.kind === 'unknown') fault = landing.fault;
      else if (landing.answers[0]?.kind === 'done') {
        messages += 1;
        confirmations += landing.answers[0].confirmations;
      }
    }
  }
  return { kind: fault ? 'unfinished' : 'undone', messages, confirmations, isDone: fault === null, fault };
}

/** Messages with confirmations in scope: those not yet taken back, and those whose taking back may not have landed. */
async function findConcerned(
  world: World,
  { by, sinceMs, untilMs }: UndoScope,
): Promise<{ message: string; confirmations: number }[]> {
  const found: { message: string; confirmations: number }[] = [];
  let chunk: string[] = [];
  const look = async () => {
    const read = await mapBounded(chunk, async (message) => {
      const { stored } = await readHistory(world, message);
      if (stored === null || isTombstone(stored)) return null;
      const inScope = stored.confirmations.filter((c) => {
        const ms = Date.parse(c.at);
        return c.by === by && ms >= sinceMs && ms < untilMs;
      });
      return {
        message,
        isConcerned: inScope.length > 0,
        confirmations: inScope.filter((c) => !c.undone).length,
      };
    });
    for (const r of read) if (r?.isConcerned) found.push(r);
    chunk = [];
  };
  for await (const message of listMessages(world)) {
    chunk.push(message);
    if (chunk.length >= bounds.recountChunkMax) await look();
  }
  await look();
  return found;
}
