import { Command, CommanderError } from 'commander';
import { addCompact } from './commands/compact.ts';
import { addConfirm } from './commands/confirm.ts';
import { addCost } from './commands/cost.ts';
import { addDemo } from './commands/demo.ts';
import { addDesk } from './commands/desk.ts';
import { addErase } from './commands/erase.ts';
import { addExplain } from './commands/explain.ts';
import { addInit } from './commands/init.ts';
import { addIntake } from './commands/intake.ts';
import { addLink } from './commands/link.ts';
import { addQueue } from './commands/queue.ts';
import { addRecount } from './commands/recount.ts';
import { addReplay } from './commands/replay.ts';
import { addReport } from './commands/report.ts';
import { addRestore } from './commands/restore.ts';
import { addRun } from './commands/run.ts';
import { addSettle } from './commands/settle.ts';
import { addUndo } from './commands/undo.ts';
import { exitCodes, type Terminal, writeError } from './terminal.ts';
import { version } from './version.ts';

/** Runs one command line (without node and script) and gives its exit code. Writes only through `terminal`. */
export async function runProgram(args: readonly string[], terminal: Terminal): Promise<number> {
  let code: number = exitCodes.done;
  const end = (given: number) => {
    code = given;
  };
  const program = new Command('tallypost')
    .description(
      'Routes inbound mail and web forms to the right queue, with a probability that can be trusted.',
    )
    .version(version)
    .helpCommand(false)
    .showHelpAfterError('(tallypost --help lists the commands, tallypost COMMAND --help its options)')
    .enablePositionalOptions()
    .exitOverride()
    .configureOutput({ writeOut: terminal.out, writeErr: terminal.err });
  for (const add of [
    addDemo,
    addInit,
    addRun,
    addConfirm,
    addExplain,
    addReplay,
    addCompact,
    addReport,
    addSettle,
    addLink,
  ])
    add(program, terminal, end);
  for (const add of [addRecount, addErase, addUndo, addQueue, addRestore, addCost, addIntake, addDesk])
    add(program, terminal, end);
  try {
    await program.parseAsync([...args], { from: 'user' });
    return code;
  } catch (error) {
    if (error instanceof CommanderError) return error.exitCode === 0 ? exitCodes.done : exitCodes.unusable;
    return writeError(terminal, args.includes('--json'), error);
  }
}
