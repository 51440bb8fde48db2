import type { Command } from 'commander';
import { type EraseResult, eraseMessages } from '../../ledger/erase.ts';
import { columns, plural } from '../layout.ts';
import { messageIdOf, openSession, type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

export function addErase(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('erase')))
    .description('take messages out of the counts and delete them and all that was kept of them')
    .argument('<message...>', 'messages, as their keys below inbound/')
    .action(async (messages: string[], flags: StoreFlags) =>
      end(await answer(terminal, flags.json === true, () => erase(messages, flags))),
    );
}

async function erase(given: readonly string[], flags: StoreFlags): Promise<Answer> {
  const { world, extractor } = await openSession(flags.store);
  const isDryRun = flags.dryRun === true;
  const result = await eraseMessages(world, extractor.schema, given.map(messageIdOf), { dryRun: isDryRun });
  return {
    json: result,
    text: describe(result, isDryRun),
    exitCode: result.isDone ? exitCodes.done : exitCodes.failed,
  };
}

function describe({ erasures, isDone, traces }: EraseResult, isDryRun: boolean): string {
  const kinds = {
    erased: 'erased',
    already: 'nothing of it was there',
    unfinished: 'unfinished',
    'dry-run': 'would be erased',
  };
  const lines = [
    columns(
      erasures.map(({ message, kind, confirmations, fault }) => [
        kinds[kind],
        message,
        fault === null ? plural(confirmations, 'confirmation') : `${fault.code} at ${fault.place}`,
      ]),
    ),
    '',
    isDryRun ? 'Each trace would be gone by:' : 'Each trace is gone by:',
    columns(traces.map(({ what, goneBy }) => [goneBy, what])),
  ];
  if (!isDone)
    lines.push('', 'What is unfinished is brought to its end by the next compaction; or run this again.');
  return lines.join('\n');
}
