import { type Command, InvalidArgumentError } from 'commander';
import type { LogLine } from '../../handlers/handler-deps.ts';
import { createIntakeHandler } from '../../handlers/intake.ts';
import { createIntakeDeskLoader } from '../../handlers/intake-desk.ts';
import { type IntakeServer, startIntakeServer } from '../intake-server.ts';
import { openSession, type StoreFlags, withStore } from '../store-session.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly port: number;
}

export function addIntake(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withStore(program.command('intake'))
    .description(
      'take forms and signed confirmations over HTTP on this machine, as the function does in the cloud',
    )
    .option('--port <number>', 'port on 127.0.0.1; 0: any that is free', readPort, 8787)
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => serveIntake(flags, terminal))),
    );
}

function readPort(text: string): number {
  const port = Number(text);
  if (!/^\d+$/.test(text) || port > 65535) throw new InvalidArgumentError('Expected 0 to 65535.');
  return port;
}

async function serveIntake(flags: Flags, terminal: Terminal): Promise<Answer> {
  const taken = { forms: 0, confirmations: 0, refused: 0, failed: 0 };
  const log = (line: LogLine) => {
    terminal.err(`${JSON.stringify(line)}\n`);
    const { status, stored } = line as unknown as { readonly status: number; readonly stored?: string };
    if (line.level === 'error') taken.failed += 1;
    else if (stored?.startsWith('inbound/')) taken.forms += 1;
    else if (stored !== undefined) taken.confirmations += 1;
    else if (status >= 400) taken.refused += 1;
  };
  const session = await openSession(flags.store, log);
  const secrets = process.env.TALLYPOST_WEBHOOK_SECRETS;
  const loadDesk = createIntakeDeskLoader(session.deps.loadDesk, secrets);
  const { settings, webhookSecrets } = await loadDesk();
  const server = await startIntakeServer(
    createIntakeHandler({ world: session.world, loadDesk, log }),
    flags.port,
  );
  const forms = settings.forms.map((form) => `${server.url}forms/${form.id}`);
  const confirmations = webhookSecrets.length === 0 ? null : `${server.url}confirmations`;
  if (flags.json === true) terminal.out(`${JSON.stringify({ kind: 'listening', forms, confirmations })}\n`);
  else
    terminal.out(
      [
        ...forms,
        confirmations ?? 'no confirmations: TALLYPOST_WEBHOOK_SECRETS is not set',
        'one line of log a request follows; ends with Ctrl-C',
        '',
      ].join('\n'),
    );
  await untilStopped(server);
  return {
    json: { kind: 'stopped', ...taken },
    text: `stopped: ${taken.forms} forms and ${taken.confirmations} confirmations stored, ${taken.refused} refused, ${taken.failed} failed`,
  };
}

async function untilStopped(server: IntakeServer): Promise<void> {
  const stop = new AbortController();
  const onSignal = () => stop.abort();
  process.once('SIGINT', onSignal);
  process.once('SIGTERM', onSignal);
  await new Promise((resolve) => stop.signal.addEventListener('abort', resolve, { once: true }));
  process.off('SIGINT', onSignal);
  process.off('SIGTERM', onSignal);
  await server.close();
}
