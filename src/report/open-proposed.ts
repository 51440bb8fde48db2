import { createHash } from 'node:crypto';
import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import { TallypostError } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { historyKey } from '../ledger/history-store.ts';
import { changeQueue, type QueueResult } from '../ledger/queues.ts';
import type { World } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import type { ReportData } from './report-data.ts';

export interface Proposal {
  /** Which group of the latest report, counted from 1. */
  readonly group: number;
  readonly queue: string;
  readonly title: string;
  /** Who says that its messages belong there. */
  readonly by: string;
  readonly dryRun?: boolean;
}

export interface OpenedProposal {
  readonly opened: QueueResult;
  /** Messages of the group that were dropped as confirmed for the new queue; the next run folds them. */
  readonly confirmed: readonly string[];
  /** Confirmed by somebody meanwhile, or gone: left as they are. */
  readonly left: readonly string[];
}

/** Opens a queue that the latest report proposed, and confirms the messages of its group for it, as a helpdesk would.
 *  Run again after a failure it goes on: a queue that is open stays so, and what is confirmed is left alone.
 *  Throws TallypostError `proposal-missing`, and what changeQueue throws. */
export async function openProposed(
  world: World,
  desk: Desk,
  schema: Schema,
  { group, queue, title, by, dryRun = false }: Proposal,
): Promise<OpenedProposal> {
  const messages = await messagesOf(world, group);
  const opened = await changeQueue(world, desk, schema, { kind: 'open', queue, title }, { dryRun });
  const confirmed: string[] = [];
  const left: string[] = [];
  for (const message of messages) {
    const isGone = (await world.store.head(keys.inbound + message)) === null;
    if (isGone || (await world.store.head(historyKey(message))) !== null) {
      left.push(message);
      continue;
    }
    confirmed.push(message);
    if (dryRun) continue;
    const drop = { message, queue, by, at: new Date(world.nowMs()).toISOString() };
    const name = createHash('sha256').update(`${queue} ${message}`).digest('hex').slice(0, 32);
    await world.store.put(`${keys.confirmations}proposed-${name}.json`, Buffer.from(JSON.stringify(drop)), {
      contentType: 'application/json',
    });
  }
  return { opened, confirmed, left };
}

async function messagesOf(world: World, group: number): Promise<readonly string[]> {
  const place = `${keys.reports}latest.json`;
  const got = await world.store.get(place, { bytesMax: bounds.ledgerJsonBytesMax });
  const data =
    got.kind === 'found' ? (JSON.parse(Buffer.from(got.object.body).toString('utf8')) as ReportData) : null;
  const found = data?.newQueues[group - 1];
  if (found !== undefined) return found.messages;
  const groups = data?.newQueues.length ?? 0;
  throw new TallypostError({
    code: 'proposal-missing',
    place,
    expected: groups === 0 ? 'a proposed queue' : `a group from 1 to ${groups}`,
    got: data === null ? 'no report' : `group ${group}`,
  });
}
