import { Command, CommanderError } from 'commander';
import { addReplay } from './commands/replay.ts';
import { exitCodes, type Terminal, writeError } from './terminal.ts';

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
    .version('0.1.0')
    .helpCommand(false)
    .showHelpAfterError('(tallypost --help lists the commands, tallypost COMMAND --help its options)')
    .exitOverride()
    .configureOutput({ writeOut: terminal.out, writeErr: terminal.err });
  addReplay(program, terminal, end);
  try {
    await program.parseAsync([...args], { from: 'user' });
    return code;
  } catch (error) {
    if (error instanceof CommanderError) return error.exitCode === 0 ? exitCodes.done : exitCodes.unusable;
    return writeError(terminal, args.includes('--json'), error);
  }
}
