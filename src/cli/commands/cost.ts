import { type Command, InvalidArgumentError } from 'commander';
import { batchOf, monthlyCost, ordinaryLoad, totalDollars } from '../../cost/monthly-cost.ts';
import { pricesOfUsEast1 } from '../../cost/prices.ts';
import { columns, count, plural } from '../layout.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags {
  readonly messages: number;
  readonly mailShare: number;
  readonly mailKb: number;
  readonly confirmedShare: number;
  readonly rawDays: number;
  readonly json?: boolean;
}

/** Of template.yaml: routing takes what is there at once, folding waits to fill its batches. */
const routeBatching = { windowSeconds: 1, batchMax: 10 };
const confirmBatching = { windowSeconds: 20, batchMax: 100 };

export function addCost(program: Command, terminal: Terminal, end: (code: number) => void): void {
  program
    .command('cost')
    .description('compute what a month on AWS costs, from how much comes in (us-east-1, no free tier)')
    .requiredOption('--messages <number>', 'messages a month', readAtLeast(1))
    .option('--mail-share <share>', 'of these, mail; the rest are forms', readShare, ordinaryLoad.mailShare)
    .option('--mail-kb <number>', 'size of an average mail', readAtLeast(1), ordinaryLoad.mailKb)
    .option(
      '--confirmed-share <share>',
      'share that a person confirms',
      readShare,
      ordinaryLoad.confirmedShare,
    )
    .option('--raw-days <days>', 'days that raw messages are kept', readAtLeast(1), ordinaryLoad.rawDays)
    .option('--json', 'answer in JSON')
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, async () => cost(flags))),
    );
}

function readAtLeast(least: number) {
  return (text: string): number => {
    const value = Number(text);
    if (!(value >= least && value <= 1e12))
      throw new InvalidArgumentError(`Expected a number from ${least} on.`);
    return value;
  };
}

function readShare(text: string): number {
  const share = Number(text);
  if (!(share >= 0 && share <= 1) || text.trim() === '') throw new InvalidArgumentError('Expected 0 to 1.');
  return share;
}

function cost(flags: Flags): Answer {
  const confirmed = flags.messages * flags.confirmedShare;
  const load = {
    ...ordinaryLoad,
    messages: flags.messages,
    mailShare: flags.mailShare,
    mailKb: flags.mailKb,
    confirmedShare: flags.confirmedShare,
    rawDays: flags.rawDays,
    routeBatch: batchOf(flags.messages, routeBatching.windowSeconds, routeBatching.batchMax),
    confirmBatch: batchOf(confirmed, confirmBatching.windowSeconds, confirmBatching.batchMax),
  };
  const lines = monthlyCost(load, pricesOfUsEast1);
  const total = totalDollars(lines);
  const money = (dollars: number) => `$${dollars.toFixed(2)}`;
  const rows = lines.map((line) => [
    money(line.dollars),
    line.service,
    line.what,
    `${line.amount < 100 ? line.amount.toFixed(2) : count(line.amount)} ${line.unit}`,
  ]);
  const text = [
    columns([...rows, [money(total), '', 'a month', plural(flags.messages, 'message')]], ['right']),
    '',
    'Prices of us-east-1 as this version knows them; those of S3, SES and logs should be checked before they matter.',
  ].join('\n');
  return { json: { totalDollars: total, load, lines, prices: pricesOfUsEast1 }, text };
}
