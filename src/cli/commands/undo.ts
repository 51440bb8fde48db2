import type { Command } from 'commander';
import { TallypostError } from '../../errors.ts';
import { undoConfirmations } from '../../ledger/undo.ts';
import { plural } from '../layout.ts';
import { openSession, readMoment, type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly by: string;
  readonly since: string;
  readonly until: string;
}

export function addUndo(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('undo')))
    .description('take back all confirmations of one person or import in a period')
    .requiredOption('--by <name>', 'whose confirmations')
    .requiredOption('--since <time>', 'from this date or time on')
    .requiredOption('--until <time>', 'up to this date or time, itself not included')
    .action(async (flags: Flags) => end(await answer(terminal, flags.json === true, () => undo(flags))));
}

async function undo(flags: Flags): Promise<Answer> {
  const sinceMs = readMoment(flags.since, '--since');
  const untilMs = readMoment(flags.until, '--until');
  if (untilMs <= sinceMs)
    throw new TallypostError({
      code: 'usage',
      place: '--until',
      expected: 'a time after --since',
      got: 'one that is not',
    });
  const { world, extractor } = await openSession(flags.store);
  const scope = { by: flags.by, sinceMs, untilMs };
  const result = await undoConfirmations(world, extractor.schema, scope, { dryRun: flags.dryRun === true });
  const what = `${plural(result.confirmations, 'confirmation')} of ${flags.by} on ${plural(result.messages, 'message')}`;
  const text = {
    'dry-run': `${what} would be taken back`,
    undone: [
      `${what} taken back; each message counts for its newest confirmation that is left, if there is one`,
      'delivered again they change nothing: what was right among them must be confirmed with a later time',
    ].join('\n'),
    unfinished: `${what} taken back so far; the next compaction goes on, or run this again`,
  }[result.kind];
  return { json: result, text, exitCode: result.isDone ? exitCodes.done : exitCodes.failed };
}
