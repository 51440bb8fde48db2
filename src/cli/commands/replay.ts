import { readFile } from 'node:fs/promises';
import type { Command } from 'commander';
import { TallypostError } from '../../errors.ts';
import { columns, count, minutes, percent, plural, size } from '../layout.ts';
import { createProgress } from '../progress.ts';
import type { ReplayResult } from '../replay/replay.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags {
  readonly learn: string;
  readonly score?: string;
  readonly progressive?: boolean;
  readonly desk?: string;
  readonly fit: boolean;
  readonly json?: boolean;
}

export function addReplay(program: Command, terminal: Terminal, end: (code: number) => void): void {
  program
    .command('replay')
    .description(
      'learn a labelled history and say how well another, or the rest of it, would have been routed',
    )
    .requiredOption('--learn <path>', 'labelled history to learn')
    .option('--score <path>', 'labelled history to score; without it the last 30 % of what there is to learn')
    .option('--progressive', 'predict each message of the history, then fold it, in order of time')
    .option('--desk <file>', "desk's file to route by; without it a desk of the labels found")
    .option('--no-fit', 'keep the exponents that an empty desk starts with')
    .option('--json', 'answer in JSON')
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => runReplay(flags, terminal))),
    );
}

async function runReplay(flags: Flags, terminal: Terminal): Promise<Answer> {
  if (flags.progressive === true && flags.score !== undefined)
    throw new TallypostError({
      code: 'usage',
      place: '--progressive',
      expected: 'one history, given by --learn',
      got: '--score as well',
    });
  const { replay } = await import('../replay/replay.ts');
  const progress = createProgress(terminal, flags.json === true);
  try {
    const result = await replay({
      learn: flags.learn,
      score: flags.score ?? null,
      isProgressive: flags.progressive === true,
      desk: flags.desk === undefined ? null : await loadDesk(flags.desk),
      isFitting: flags.fit,
      nowMs: Date.now(),
      onProgress: progress.show,
    });
    progress.end();
    return { json: result, text: describe(result, terminal) };
  } finally {
    progress.end();
  }
}

async function loadDesk(file: string) {
  const { readDesk } = await import('../../desk/read-desk.ts');
  const bytes = await readFile(file).catch((cause: unknown) => {
    throw new TallypostError(
      { code: 'file-missing', place: file, expected: "a desk's file", got: 'none that can be read' },
      cause,
    );
  });
  return readDesk(bytes, file);
}

function describe(result: ReplayResult, { colours }: Terminal): string {
  const { bold, dim, yellow } = colours;
  const { decisions, staffMinutes } = result;
  const [low, high] = result.accuracyInterval;
  const lines = [
    `${bold(result.mode)}${result.note === '' ? '' : `\n${dim(result.note)}`}`,
    '',
    columns([
      ['learned', plural(result.learned, 'message')],
      ['scored', `${plural(result.scored, 'message')} of ${plural(result.queues, 'queue')}`],
      [
        'likeliest queue right',
        `${percent(result.accuracy)}  (95 % interval ${percent(low)} to ${percent(high)})`,
      ],
      ['log loss', `${result.logLoss.toFixed(4)} nats a message`],
      ['calibration error', percent(result.calibrationError)],
      ['routable at 95 % right', percent(result.routedAt95)],
    ]),
    '',
    bold(
      `Decided by costs (a look ${staffMinutes.lookMinutes} min, a wrong route ${staffMinutes.wrongRouteMinutes} min)`,
    ),
    columns(
      [
        [
          'routed',
          count(decisions.routed),
          decisions.routedPrecision === null ? '' : `${percent(decisions.routedPrecision)} of them right`,
        ],
        ...(decisions.guarded > 0
          ? [['by a guard', count(decisions.guarded), `${count(decisions.guardedRight)} of them right`]]
          : []),
        ['held', count(decisions.held), percent(result.heldShare)],
        ['staff time', minutes(staffMinutes.withRouting), `instead of ${minutes(staffMinutes.lookAtEach)}`],
      ],
      ['left', 'right', 'left'],
    ),
    '',
    bold('If the top posterior alone decided'),
    columns(
      [
        ['routed', 'right', 'from posterior'],
        ...result.curve.map((point) => [
          percent(point.routedShare),
          percent(point.precision),
          point.posteriorMin.toFixed(4),
        ]),
      ],
      ['right', 'right', 'right'],
    ),
    '',
    bold('What was said, and how often it came true'),
    columns(
      [
        ['said', 'came true', '95 % interval', 'messages'],
        ...result.calibration.map((bin) => [
          percent(bin.said),
          percent(bin.cameTrue),
          `${percent(bin.interval[0])} to ${percent(bin.interval[1])}`,
          count(bin.messages),
        ]),
      ],
      ['right', 'right', 'right', 'right'],
    ),
    '',
    columns([
      ['table', `${size(result.tableBytes)}, ${count(result.cells)} cells`],
      ['speed', `${count(result.messagesPerSecond)} messages a second from bytes to decision`],
      ['memory', size(result.peakRssBytes)],
      ['time', `${result.seconds.total.toFixed(1)} s, ${result.seconds.learn.toFixed(1)} s of it learning`],
    ]),
  ];
  for (const { path, unusable, faults, defects } of result.histories) {
    const found = Object.entries(defects).sort((a, b) => b[1] - a[1]);
    if (found.length > 0) {
      lines.push('', bold(`On record in ${path}`));
      lines.push(
        columns(
          found.map(([code, n]) => [count(n), code]),
          ['right', 'left'],
        ),
      );
    }
    if (unusable === 0) continue;
    lines.push(
      '',
      yellow(`${plural(unusable, 'line or file', 'lines or files')} of ${path} could not be used:`),
    );
    for (const fault of faults)
      lines.push(`  ${fault.place}: ${fault.code}, expected ${fault.expected}, got ${fault.got}`);
    if (unusable > faults.length) lines.push(dim(`  and ${count(unusable - faults.length)} more`));
  }
  return lines.join('\n');
}
