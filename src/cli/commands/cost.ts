import { type Command, InvalidArgumentError } from 'commander';
import { type Load, machineOfTemplate, ordinaryLoad } from '../../cost/load.ts';
import { type CostLine, monthlyCost, totalDollars } from '../../cost/monthly-cost.ts';
import { pricesOfUsEast1 } from '../../cost/prices.ts';
import { columns, count, plural } from '../layout.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

type Flags = Partial<Load> & { readonly json?: boolean };

/** Shown beside each other when no number is given. */
const scales = [1_000, 100_000, 10_000_000];

export function addCost(program: Command, terminal: Terminal, end: (code: number) => void): void {
  const { mailShare, mailKb, confirmedShare, queues, rawDays, historyMonths } = ordinaryLoad;
  program
    .command('cost')
    .description('compute what a month on AWS costs, from how much comes in (us-east-1, no free tier)')
    .option(
      '--messages <number>',
      'messages a month; without it 1,000, 100,000 and 10,000,000',
      readAtLeast(1),
    )
    .option('--mail-share <share>', 'of these, mail; the rest are forms', readShare, mailShare)
    .option('--mail-kb <number>', 'size of an average mail', readAtLeast(1), mailKb)
    .option('--confirmed-share <share>', 'share that a person confirms', readShare, confirmedShare)
    .option('--queues <number>', 'queues of the desk', readAtLeast(1), queues)
    .option('--raw-days <days>', 'days that raw messages are kept', readAtLeast(1), rawDays)
    .option('--history-months <months>', 'months of confirmed messages kept', readAtLeast(1), historyMonths)
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

interface Month {
  readonly totalDollars: number;
  readonly load: Load;
  readonly lines: readonly CostLine[];
}

function cost({ json: _, messages, ...given }: Flags): Answer {
  const months = (messages === undefined ? scales : [messages]).map((each): Month => {
    const load = { ...ordinaryLoad, ...given, messages: each };
    const lines = monthlyCost(load, machineOfTemplate, pricesOfUsEast1);
    return { totalDollars: totalDollars(lines), load, lines };
  });
  const text = [
    months.length === 1 ? describeOne(months[0]!) : describeScales(months),
    '',
    'Prices of us-east-1 as this version knows them, free tiers left out; those of all but Lambda and SQS are from memory: check',
    'them before they matter. --json tells every amount, price and assumption.',
  ].join('\n');
  const assumed = { machine: machineOfTemplate, prices: pricesOfUsEast1 };
  return { json: messages === undefined ? { months, ...assumed } : { ...months[0], ...assumed }, text };
}

const money = (dollars: number) =>
  `$${dollars.toLocaleString('en-US', { minimumFractionDigits: 2, maximumFractionDigits: 2 })}`;

function describeOne({ load, lines, totalDollars: total }: Month): string {
  const rows = lines.map((line) => [
    money(line.dollars),
    line.service,
    line.what,
    `${line.amount < 100 ? line.amount.toFixed(2) : count(line.amount)} ${line.unit}`,
  ]);
  return columns([...rows, [money(total), '', 'a month', plural(load.messages, 'message')]], ['right']);
}

function describeScales(months: readonly Month[]): string {
  const rows = (months[0] as Month).lines.map(({ service, what }, i) => [
    service,
    what,
    ...months.map(({ lines }) => money((lines[i] as CostLine).dollars)),
  ]);
  const perThousand = months.map(({ load, totalDollars: total }) => money((total / load.messages) * 1000));
  return columns(
    [
      ['', 'messages a month', ...months.map(({ load }) => count(load.messages))],
      ...rows,
      ['', 'a month', ...months.map(({ totalDollars: total }) => money(total))],
      ['', 'for 1,000 messages', ...perThousand],
    ],
    ['left', 'left', 'right', 'right', 'right'],
  );
}
