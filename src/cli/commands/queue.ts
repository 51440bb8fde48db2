import { type Command, InvalidArgumentError } from 'commander';
import { changeQueue, type QueueChange, type QueueResult } from '../../ledger/queues.ts';
import { openProposed } from '../../report/open-proposed.ts';
import { plural } from '../layout.ts';
import { openSession, type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface TitleFlags extends StoreFlags {
  readonly title?: string;
}

interface OpenFlags extends StoreFlags {
  readonly title: string;
  readonly wrongMinutes?: number;
  readonly proposal?: number;
  readonly by: string;
}

export function addQueue(program: Command, terminal: Terminal, end: (code: number) => void): void {
  const queue = program
    .command('queue')
    .description(
      'change a queue with all it has learned. There is no command that splits one: open the new queue and confirm its messages again',
    );
  const act = async (flags: StoreFlags, change: QueueChange) =>
    end(await answer(terminal, flags.json === true, () => run(flags, change)));

  withDryRun(withStore(queue.command('rename')))
    .description('give a queue another id')
    .argument('<from>')
    .argument('<to>')
    .option('--title <text>', 'and another title')
    .action((from: string, to: string, flags: TitleFlags) =>
      act(flags, { kind: 'rename', from, to, ...(flags.title === undefined ? {} : { title: flags.title }) }),
    );
  withDryRun(withStore(queue.command('merge')))
    .description('let the messages of one queue count for another')
    .argument('<from>')
    .argument('<into>')
    .action((from: string, into: string, flags: StoreFlags) => act(flags, { kind: 'merge', from, into }));
  withDryRun(withStore(queue.command('retire')))
    .description('route nothing to a queue any more; its successor takes over what it learned')
    .argument('<queue>')
    .argument('<successor>')
    .action((id: string, successor: string, flags: StoreFlags) =>
      act(flags, { kind: 'retire', queue: id, successor }),
    );
  withDryRun(withStore(queue.command('open')))
    .description('open a new queue, or again one that was merged or retired, with what it had learned')
    .argument('<queue>')
    .requiredOption('--title <text>', 'what people read')
    .option('--wrong-minutes <minutes>', 'staff minutes lost by a wrong route to it', readMinutes)
    .option(
      '--proposal <group>',
      'confirm for it the messages of a group that the latest report proposes',
      readGroup,
    )
    .option('--by <name>', 'who confirms them', 'report proposal')
    .action(async (id: string, flags: OpenFlags) => {
      const { proposal } = flags;
      if (proposal !== undefined)
        return end(await answer(terminal, flags.json === true, () => openWith(id, proposal, flags)));
      return act(flags, {
        kind: 'open',
        queue: id,
        title: flags.title,
        ...(flags.wrongMinutes === undefined ? {} : { wrongRouteMinutes: flags.wrongMinutes }),
      });
    });
}

function readGroup(text: string): number {
  const group = Number(text);
  if (!Number.isInteger(group) || group < 1) throw new InvalidArgumentError('Expected a number from 1.');
  return group;
}

async function openWith(queue: string, group: number, flags: OpenFlags): Promise<Answer> {
  const { world, desk, extractor } = await openSession(flags.store);
  const dryRun = flags.dryRun === true;
  const proposal = { group, queue, title: flags.title, by: flags.by, dryRun };
  const result = await openProposed(world, desk, extractor.schema, proposal);
  const isDone = result.opened.kind !== 'lost-race' && result.opened.deskFile !== 'unfinished';
  const confirmed = `${plural(result.confirmed.length, 'message')} ${dryRun ? 'would be' : 'are'} confirmed for it${dryRun ? '' : '; the next tallypost run folds them'}`;
  const left =
    result.left.length === 0
      ? ''
      : `\n${plural(result.left.length, 'message')} of the group left as they are: confirmed meanwhile, or gone`;
  return {
    json: result,
    text: `${describe(result.opened)}\n${confirmed}${left}`,
    exitCode: isDone ? exitCodes.done : exitCodes.failed,
  };
}

function readMinutes(text: string): number {
  const minutes = Number(text);
  if (!(minutes >= 0) || text.trim() === '') throw new InvalidArgumentError('Expected minutes, 0 or more.');
  return minutes;
}

async function run(flags: StoreFlags, change: QueueChange): Promise<Answer> {
  const { world, desk, extractor } = await openSession(flags.store);
  const result = await changeQueue(world, desk, extractor.schema, change, { dryRun: flags.dryRun === true });
  const isDone = result.kind !== 'lost-race' && result.deskFile !== 'unfinished';
  return { json: result, text: describe(result), exitCode: isDone ? exitCodes.done : exitCodes.failed };
}

function describe(result: QueueResult): string {
  const moved = `${plural(result.messages, 'learned message')} ${result.kind === 'dry-run' ? 'would count' : 'count'} for another queue`;
  const text = {
    changed: `changed, as of version ${result.version}; ${moved}`,
    'nothing-to-do': 'it was so already',
    'lost-race': 'others were writing at the same time; nothing was changed; try again',
    'dry-run': `${moved}; nothing was changed`,
  }[result.kind];
  const file = {
    updated: '; config/desk.json says so too',
    unchanged: '',
    missing: '; config/desk.json is missing',
    unfinished: '; config/desk.json could not be brought in line: run this again',
  }[result.deskFile];
  return text + file;
}
