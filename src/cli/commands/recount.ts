import type { Command } from 'commander';
import { readMessage } from '../../handlers/read-message.ts';
import { type RecountResult, recount } from '../../ledger/recount.ts';
import { fitTable } from '../../model/fit-table.ts';
import { keys } from '../../store/keys.ts';
import { columns, count, plural } from '../layout.ts';
import { openSession, type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly repair?: boolean;
}

export function addRecount(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('recount')))
    .description('count every confirmed message again and compare with the table, cell by cell')
    .option(
      '--repair',
      'make the recount the table where they differ, or after the desk changed what is counted',
    )
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => runRecount(flags))),
    );
}

async function runRecount(flags: Flags): Promise<Answer> {
  const { world, desk, extractor } = await openSession(flags.store);
  const result = await recount(world, desk, extractor.schema, {
    repair: flags.repair === true && flags.dryRun !== true,
    fitModel: fitTable,
    reread: async (message) => {
      const found = await readMessage(world, keys.inbound + message, () => true);
      return found?.message ? extractor.extract(found.message) : null;
    },
  });
  const isRight = result.fault === null && result.differences.length === 0;
  const isMended = result.repair === 'repaired';
  return {
    json: { ...result, isRight },
    text: describe(result, isRight),
    exitCode: isRight || isMended ? exitCodes.done : exitCodes.failed,
  };
}

function describe(result: RecountResult, isRight: boolean): string {
  const lines = [`counted ${plural(result.messages, 'message')} again, as of version ${result.version}`];
  if (isRight) lines.push('0 cells differ: the table is what its confirmations say');
  if (result.fault?.code === 'contended')
    lines.push('not compared: messages were erased or a version restored during every pass; try again');
  else if (result.fault !== null)
    lines.push(
      `the table cannot be read: ${result.fault.code} at ${result.fault.place}, expected ${result.fault.expected}, got ${result.fault.got}`,
    );
  if (result.differences.length > 0) {
    lines.push(`${plural(result.differences.length, 'cell')} or more differ:`);
    lines.push(
      columns(
        [
          ['table', 'recount', 'cell'],
          ...result.differences.map(({ cell, left, right }) => [count(left), count(right), cell]),
        ],
        ['right', 'right'],
      ),
    );
  }
  if (result.unread > 0)
    lines.push(`${plural(result.unread, 'message')} left out: features of another schema, raw message gone`);
  if (result.repair === 'repaired') lines.push('repaired: the recount is the table now');
  if (result.repair === 'lost-race') lines.push('not repaired: others were writing all the time; try again');
  if (result.repair === 'none' && !isRight)
    lines.push('tallypost recount --repair puts the recount in its place');
  return lines.join('\n');
}
