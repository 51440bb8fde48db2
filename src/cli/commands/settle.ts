import { userInfo } from 'node:os';
import { type Command, InvalidArgumentError } from 'commander';
import { createConfirmHandler } from '../../handlers/confirm.ts';
import { queueEvent } from '../../handlers/local-runner.ts';
import { readMessage } from '../../handlers/read-message.ts';
import { createBenchOpener } from '../../handlers/settle-bench.ts';
import { type SettleServer, startSettleServer } from '../../settle/settle-server.ts';
import { ticketKeyOf } from '../../settle/ticket.ts';
import { createWaitingList } from '../../settle/waiting.ts';
import { plural } from '../layout.ts';
import { openSession, type StoreFlags, type StoreSession, withStore } from '../store-session.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly by: string;
  readonly port: number;
  readonly fold: boolean;
}

export function addSettle(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withStore(program.command('settle'))
    .description('open the page on this machine where a person settles held messages; ends with Ctrl+C')
    .option('--by <name>', 'who settles, as confirmations will say', defaultName())
    .option('--port <number>', 'port of 127.0.0.1; 0: any that is free', readPort, 0)
    .option('--no-fold', 'leave what was settled to tallypost run, or to the functions behind the bucket')
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => settle(flags, terminal))),
    );
}

async function settle(flags: Flags, terminal: Terminal): Promise<Answer> {
  const session = await openSession(flags.store);
  const served = await serveSettling(session, flags);
  const link = served.server.linkFor(flags.by);
  // On the error stream, so that the answer alone stands in the output.
  terminal.err(`Open this once, on this machine, as ${flags.by}:\n\n  ${link}\n\nCtrl+C ends the page.\n`);
  await new Promise<void>((resolve) => {
    process.once('SIGINT', resolve);
    process.once('SIGTERM', resolve);
  });
  await served.server.close();
  const settled = served.settled();
  return { json: { settled }, text: `settled ${plural(settled, 'message')}` };
}

/** The page of a store, served on this machine. Each settlement is folded at once, by the function that runs in the cloud, so
 *  that the next message is weighed with what was just learned. */
export async function serveSettling(
  { world, deps }: StoreSession,
  { port, fold }: { readonly port: number; readonly fold: boolean },
): Promise<{ readonly server: SettleServer; settled(): number }> {
  const confirm = createConfirmHandler(deps);
  let settled = 0;
  const server = await startSettleServer(
    {
      world,
      openBench: createBenchOpener(deps),
      readMessage: async (key) => (await readMessage(world, key, () => true))?.message ?? null,
      waiting: createWaitingList(world),
      ticketKey: ticketKeyOf(deps.tokenKey),
      async onDropped(key) {
        settled += 1;
        if (fold) await confirm(queueEvent([key], '', world.nowMs(), world.random));
      },
    },
    port,
  );
  return { server, settled: () => settled };
}

function defaultName(): string {
  try {
    return userInfo().username;
  } catch {
    // No entry in the system's list of users, as in some containers.
    return 'somebody';
  }
}

function readPort(text: string): number {
  const port = Number(text);
  if (!Number.isInteger(port) || port < 0 || port > 65_535)
    throw new InvalidArgumentError('Expected a port from 0 to 65535.');
  return port;
}
