import { columns, count, percent, plural } from '../layout.ts';
import type { Terminal } from '../terminal.ts';
import type { DemoSummary } from './summarise-demo.ts';

/** A summary for people. */
export function describeDemo(
  summary: DemoSummary & { readonly seconds: number },
  terminal: Terminal,
): string {
  const { bold, dim, green, red } = terminal.colours;
  const { recount, corrections, calibration } = summary;
  const rate = (share: number | null) => (share === null ? '-' : percent(share));
  const right = ['left', 'right', 'right', 'right', 'right', 'right'] as const;
  const groups = (
    rows: readonly {
      messages: number;
      accuracy: number | null;
      heldShare: number | null;
      routedPrecision: number | null;
    }[],
    names: readonly string[],
  ) =>
    columns(
      [
        ['', 'messages', 'named right', 'held', 'routed right'],
        ...rows.map((row, index) => [
          names[index]!,
          count(row.messages),
          rate(row.accuracy),
          rate(row.heldShare),
          rate(row.routedPrecision),
        ]),
      ],
      right,
    );
  const isWithin = calibration.bands.filter(
    (band) => band.said >= band.interval[0] && band.said <= band.interval[1],
  );
  const isSame = summary.faults.length === 0 && recount.differences === 0;
  const parts = [
    bold(
      `${plural(summary.messages, 'message')} in ${summary.days} days, played in ${summary.seconds.toFixed(0)} s`,
    ),
    dim('named right: the likeliest queue was the true one; routed right: of those sent on without a look'),
    '',
    bold('Month by month'),
    groups([...summary.months, summary], [...summary.months.map((month) => month.name), 'all']),
    '',
    bold('Did what was said come true?'),
    columns(
      [
        ['said', 'came true', '95 % interval', 'messages'],
        ...calibration.bands.map((band) => [
          percent(band.said),
          percent(band.cameTrue),
          `${percent(band.interval[0])} to ${percent(band.interval[1])}`,
          count(band.messages),
        ]),
      ],
      ['right', 'right', 'right', 'right'],
    ),
    dim(
      `${isWithin.length} of ${calibration.bands.length} bands hold what was said within their interval; mean gap ${percent(calibration.error)}`,
    ),
    '',
    bold('What the staff said'),
    `${plural(corrections.confirmed, 'message')} confirmed, ${count(corrections.never)} never; ` +
      `${plural(corrections.wrongAtFirst, 'confirmation')} wrong at first and later corrected: taken out of one queue's counts and put into another's`,
    '',
    bold('Held for a person'),
    columns(
      Object.entries(summary.holds)
        .sort((a, b) => b[1] - a[1])
        .map(([reason, held]) => [count(held), reason]),
      ['right'],
    ),
    '',
    bold('Sent by a fixed guard, whatever the counts say'),
    columns(
      summary.guards.map((guard) => [
        count(guard.messages),
        guard.name,
        `${count(guard.right)} of them to the true queue`,
      ]),
      ['right'],
    ),
  ];
  for (const opening of summary.openings) {
    const after =
      opening.firstRoutedAfterConfirmations === null
        ? 'nothing was routed to it'
        : `first routed to it after ${plural(opening.firstRoutedAfterConfirmations, 'confirmation')}`;
    parts.push(
      '',
      bold(`A queue opens: ${opening.queue}, ${opening.openedAt.slice(0, 10)}`),
      dim(`before that ${opening.before} got its letters; ${after}`),
      groups(
        opening.periods,
        opening.periods.map(({ period }) => period),
      ),
    );
  }
  parts.push(
    '',
    bold('A campaign brings new words for known matters'),
    groups(
      summary.campaign,
      summary.campaign.map(({ period }) => period),
    ),
    '',
    bold('Counted again'),
    isSame
      ? green(
          `0 cells differ: after ${plural(summary.compactions, 'compaction')} the table is what ${plural(recount.messages, 'history', 'histories')} say, version ${summary.version}`,
        )
      : red([`${plural(recount.differences, 'cell')} or more differ`, ...summary.faults].join('; ')),
  );
  if (summary.troubles > 0) {
    parts.push('', red(`${plural(summary.troubles, 'warning')} in the functions' log, the first of them:`));
    for (const line of summary.firstTroubles) parts.push(`  ${JSON.stringify(line)}`);
  }
  return parts.join('\n');
}
