import type { Command } from 'commander';
import { bounds } from '../../bounds.ts';
import { createCompactHandler } from '../../handlers/compact.ts';
import { type CompactionResult, compact } from '../../ledger/compaction.ts';
import { columns, count, plural, size } from '../layout.ts';
import { openSession, type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly force?: boolean;
}

export function addCompact(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('compact')))
    .description(
      "do the night's work now: one table of all that was learned, exponents fitted, old objects deleted",
    )
    .option('--force', 'also when nothing was learned since the last time')
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => runCompact(flags))),
    );
}

async function runCompact(flags: Flags): Promise<Answer> {
  const { world, desk, extractor, deps } = await openSession(flags.store);
  if (flags.dryRun === true || flags.force === true) {
    const compaction = await compact(world, desk, extractor.schema, {
      dryRun: flags.dryRun === true,
      force: flags.force === true,
    });
    return answerOf({ compaction, leftDrops: null });
  }
  return answerOf(await createCompactHandler(deps)({}));
}

function answerOf(result: {
  readonly compaction: CompactionResult;
  readonly leftDrops: { readonly done: number; readonly remaining: number } | null;
}): Answer {
  const { compaction } = result;
  const isLost = compaction.kind === 'lost-race';
  return { json: result, text: describe(compaction), exitCode: isLost ? exitCodes.failed : exitCodes.done };
}

function describe(done: CompactionResult): string {
  if (done.kind === 'nothing-new') return `nothing was learned since version ${done.version}`;
  if (done.kind === 'lost-race') return 'another process compacted at the same time; nothing is lost';
  const rows = [
    ['learned', plural(done.messages, 'message')],
    ['batches absorbed', count(done.segments)],
    ['cells', count(done.cells)],
  ];
  if (done.kind === 'dry-run') return columns([...rows, ['', 'nothing was changed']]);
  rows.push(['table for routing', size(done.tableBytes)], ['version', String(done.version)]);
  if (done.fit !== null && done.fit.logLoss !== null)
    rows.push([
      'log loss, each left out',
      `${done.fit.logLoss.toFixed(4)} nats over ${plural(done.fit.messages, 'message')}`,
    ]);
  if (done.bursts.uncounted > 0)
    rows.push([
      `alike messages, not routed by beyond ${bounds.burstCountedMax}`,
      count(done.bursts.uncounted),
    ]);
  if (done.deletedObjects > 0) rows.push(['old objects deleted', count(done.deletedObjects)]);
  return columns(rows);
}
