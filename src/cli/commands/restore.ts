import { type Command, InvalidArgumentError } from 'commander';
import { restoreVersion } from '../../ledger/restore.ts';
import { plural } from '../layout.ts';
import { openSession, type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly version: number;
}

export function addRestore(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('restore')))
    .description('return what was learned to an earlier version; later confirmations are taken back')
    .requiredOption('--version <number>', 'version as routing writes it on messages', readVersion)
    .action(async (flags: Flags) => end(await answer(terminal, flags.json === true, () => restore(flags))));
}

function readVersion(text: string): number {
  const version = Number(text);
  if (!Number.isSafeInteger(version) || version < 0)
    throw new InvalidArgumentError('Expected a whole number.');
  return version;
}

async function restore(flags: Flags): Promise<Answer> {
  const { world, desk, extractor } = await openSession(flags.store);
  const result = await restoreVersion(world, desk, extractor.schema, flags.version, {
    dryRun: flags.dryRun === true,
  });
  const back = `${plural(result.segments, 'batch', 'batches')} of confirmations`;
  const text = {
    'dry-run': `${back} since version ${result.to} would be taken back`,
    restored: `restored version ${result.to} as version ${result.version}; ${back} taken back`,
    'nothing-to-do': `nothing was learned since version ${result.to}`,
    unfinished: `restored, but not yet written into every history; the next compaction goes on`,
    'lost-race': 'others were writing at the same time; nothing was changed; try again',
  }[result.kind];
  const isDone = result.kind !== 'unfinished' && result.kind !== 'lost-race';
  return { json: result, text, exitCode: isDone ? exitCodes.done : exitCodes.failed };
}
