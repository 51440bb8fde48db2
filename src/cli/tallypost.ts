import { runProgram } from './program.ts';
import { processTerminal } from './terminal.ts';

// A reader that closes early (head, less) is no failure.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(0);
  throw error;
});
process.exitCode = await runProgram(process.argv.slice(2), processTerminal());
