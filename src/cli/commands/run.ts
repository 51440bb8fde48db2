import { type Command, InvalidArgumentError } from 'commander';
import type { LogLine } from '../../handlers/handler-deps.ts';
import { followWaiting, type RunSummary, runWaiting } from '../../handlers/local-runner.ts';
import { count, plural } from '../layout.ts';
import { createProgress, type Progress } from '../progress.ts';
import { openSession, type StoreFlags, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly follow?: boolean;
  readonly every: number;
  readonly log?: boolean;
}

export function addRun(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withStore(program.command('run'))
    .description('do what waits in a store: route messages, fold confirmations, compact when it is time')
    .option('--follow', 'go on until interrupted, looking again after each round')
    .option('--every <seconds>', 'pause between rounds with --follow', readSeconds, 2)
    .option('--log', 'write every log line of the functions on stderr, as they do in the cloud')
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => run(flags, terminal))),
    );
}

function readSeconds(text: string): number {
  const seconds = Number(text);
  if (!(seconds >= 0.1 && seconds <= 3600)) throw new InvalidArgumentError('Expected 0.1 to 3600 seconds.');
  return seconds;
}

async function run(flags: Flags, terminal: Terminal): Promise<Answer> {
  const session = await openSession(flags.store, logger(flags, terminal));
  const progress = createProgress(terminal, flags.json === true);
  const onProgress = ({ step, done, total }: { step: string; done: number; total: number }) =>
    progress.show(done, total, `${steps[step] ?? step} ${count(done)} of ${count(total)}`);
  if (flags.follow !== true) {
    const summary = await runWaiting(session.deps, { onProgress }).finally(progress.end);
    return { json: summary, text: describe(summary), exitCode: exitOf(summary) };
  }
  return follow(flags, terminal, session.deps, progress);
}

const steps: Record<string, string> = { route: 'routing', confirm: 'folding', compact: 'compacting' };

async function follow(
  flags: Flags,
  terminal: Terminal,
  deps: Parameters<typeof followWaiting>[0],
  progress: Progress,
): Promise<Answer> {
  const stop = new AbortController();
  const onSignal = () => stop.abort();
  process.once('SIGINT', onSignal);
  process.once('SIGTERM', onSignal);
  const total = {
    rounds: 0,
    routed: 0,
    held: 0,
    guarded: 0,
    confirmed: 0,
    refused: 0,
    failed: 0,
    compactions: 0,
  };
  try {
    await followWaiting(deps, {
      signal: stop.signal,
      intervalMs: flags.every * 1000,
      onRound(summary) {
        total.rounds += 1;
        for (const name of ['routed', 'held', 'guarded', 'confirmed', 'refused', 'failed'] as const)
          total[name] += summary[name];
        if (summary.compaction !== null) total.compactions += 1;
        if (isQuiet(summary)) return;
        if (flags.json === true) terminal.out(`${JSON.stringify(summary)}\n`);
        else terminal.out(`${new Date().toISOString()}  ${inOneLine(summary)}\n`);
      },
    });
  } finally {
    process.off('SIGINT', onSignal);
    process.off('SIGTERM', onSignal);
    progress.end();
  }
  const text = `stopped after ${plural(total.rounds, 'round')}: ${inOneLine(total)}`;
  return { json: { kind: 'stopped', ...total }, text, exitCode: exitOf(total) };
}

/** Functions log for machines; a person is told what went wrong, and all of it only when asked. */
function logger(flags: Flags, terminal: Terminal): (line: LogLine) => void {
  return (line) => {
    if (flags.log === true) terminal.err(`${JSON.stringify(line)}\n`);
    else if (line.level !== 'info') {
      const { level, event, ...members } = line;
      terminal.err(`${terminal.colours.yellow(`${level}: ${event}`)} ${JSON.stringify(members)}\n`);
    }
  };
}

type Counted = Pick<RunSummary, 'routed' | 'held' | 'guarded' | 'confirmed' | 'refused' | 'failed'>;

function exitOf({ refused, failed }: Counted): number {
  return refused + failed > 0 ? exitCodes.failed : exitCodes.done;
}

function isQuiet(summary: RunSummary): boolean {
  const { routed, held, guarded, confirmed, refused, failed, compaction } = summary;
  return routed + held + guarded + confirmed + refused + failed === 0 && compaction === null;
}

function inOneLine(done: Counted): string {
  const parts = (['routed', 'held', 'guarded', 'confirmed', 'refused', 'failed'] as const)
    .filter((name) => done[name] > 0)
    .map((name) => `${count(done[name])} ${name}`);
  return parts.length === 0 ? 'nothing waited' : parts.join(', ');
}

function describe(summary: RunSummary): string {
  const lines = [inOneLine(summary)];
  if (summary.refused > 0)
    lines.push('refused confirmations lie in confirmations-refused/ with what is wrong with them');
  if (summary.failed > 0) lines.push('what failed is tried again by the next run');
  const compaction = summary.compaction?.compaction;
  if (compaction?.kind === 'compacted')
    lines.push(
      `compacted ${plural(compaction.segments, 'segment')}: ${plural(compaction.messages, 'message')} learned, version ${compaction.version}`,
    );
  return lines.join('\n');
}
