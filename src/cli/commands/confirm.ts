import { randomBytes } from 'node:crypto';
import type { Command } from 'commander';
import { TallypostError } from '../../errors.ts';
import { isTombstone } from '../../ledger/history.ts';
import { readHistory } from '../../ledger/history-store.ts';
import { loadModel } from '../../ledger/load-model.ts';
import { keys } from '../../store/keys.ts';
import {
  messageIdOf,
  openSession,
  readMoment,
  type StoreFlags,
  withDryRun,
  withStore,
} from '../store-session.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly by: string;
  readonly at?: string;
}

export function addConfirm(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('confirm')))
    .description('say to which queue a message belongs, as a helpdesk would; the next run folds it')
    .argument('<message>', 'the message, as its key below inbound/')
    .argument('<queue>', 'the id of the right queue')
    .requiredOption('--by <name>', 'who says so')
    .option('--at <time>', 'when it was said, if not now')
    .action(async (message: string, queue: string, flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => confirm(message, queue, flags))),
    );
}

async function confirm(given: string, queue: string, flags: Flags): Promise<Answer> {
  const session = await openSession(flags.store);
  const { world } = session;
  const message = messageIdOf(given);
  const atMs = flags.at === undefined ? world.nowMs() : readMoment(flags.at, '--at');
  const { desk } = await loadModel(world, session.desk, session.extractor.schema, null);
  if (!desk.queues.some((each) => each.id === queue))
    throw new TallypostError({
      code: 'queue-unknown',
      place: keys.desk,
      expected: `one of ${desk.queues.map((each) => each.id).join(', ')}`,
      got: JSON.stringify(queue),
    });
  const { stored } = await readHistory(world, message);
  const isKnown = stored !== null && !isTombstone(stored);
  if (!isKnown && (await world.store.head(keys.inbound + message)) === null)
    throw new TallypostError({
      code: 'message-missing',
      place: keys.inbound + message,
      expected: 'a message',
      got: stored === null ? 'nothing' : 'an erased one',
    });
  const confirmation = { message, queue, by: flags.by, at: new Date(atMs).toISOString() };
  const key = `${keys.confirmations}${world.nowMs()}-${randomBytes(6).toString('hex')}.json`;
  const isDryRun = flags.dryRun === true;
  if (!isDryRun) {
    const body = new TextEncoder().encode(`${JSON.stringify(confirmation)}\n`);
    await world.store.put(key, body, { ifNoneMatch: '*', contentType: 'application/json' });
  }
  return {
    json: { kind: isDryRun ? 'dry-run' : 'dropped', key: isDryRun ? null : key, confirmation },
    text: isDryRun
      ? `${message} would be confirmed for ${queue}`
      : `${message} belongs to ${queue}, says ${flags.by}; folded by the next: tallypost run --store ${flags.store}`,
  };
}
