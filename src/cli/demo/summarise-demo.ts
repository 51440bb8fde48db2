import { calibrationBins, calibrationError, wilsonInterval } from '../replay/metrics.ts';
import type { DemoScenario } from './demo-scenario.ts';
import type { DemoPlay, DemoRow } from './play-demo.ts';

const dayMs = 24 * 3_600_000;
const bandsCount = 10;

/** The play in numbers; JSON-able. `rows` of guarded messages count for the guards only: a guard claims no probability. */
export function summariseDemo(play: DemoPlay, scenario: DemoScenario) {
  const { rows } = play;
  const said = rows.filter((row) => row.queue !== null && row.kind !== 'guarded').map(outcomeOf);
  const bands = calibrationBins(said, bandsCount);
  return {
    days: play.days,
    ...share(rows),
    months: groupBy(rows, ({ message }) => new Date(message.arrivesAtMs).toISOString().slice(0, 7)),
    calibration: { error: calibrationError(bands), bands },
    confirmations: play.confirmations,
    corrections: corrections(rows),
    guards: groupBy(
      rows.filter((row) => row.kind === 'guarded'),
      (row) => row.reason,
    ),
    holds: countBy(
      rows.filter((row) => row.kind === 'held'),
      (row) => row.reason,
    ),
    openings: scenario.openings.map(({ queue, atMs, before }) => opening(rows, queue, atMs, before)),
    campaign: [
      {
        period: 'the four weeks before',
        ...share(rows, scenario.campaign.fromMs - 28 * dayMs, scenario.campaign.fromMs),
      },
      {
        period: 'its first two weeks',
        ...share(rows, scenario.campaign.fromMs, scenario.campaign.fromMs + 14 * dayMs),
      },
      {
        period: 'the rest of it',
        ...share(rows, scenario.campaign.fromMs + 14 * dayMs, scenario.campaign.toMs),
      },
    ],
    compactions: play.compactions,
    fits: play.fits,
    lastCompaction: play.lastCompaction,
    recount: play.recount,
    faults: play.faults,
    report: play.report,
    version: play.version,
    troubles: play.troubles.length,
    firstTroubles: play.troubles.slice(0, 5),
  };
}

export type DemoSummary = ReturnType<typeof summariseDemo>;

function outcomeOf(row: DemoRow) {
  const isRight = row.queue === row.message.trueQueue;
  return { top: row.posterior, isRight, trueProbability: isRight ? row.posterior : 0 };
}

/** What became of the messages that arrived in a period: how many, how often the queue named was right, what was held. */
function share(rows: readonly DemoRow[], fromMs = 0, toMs = Number.POSITIVE_INFINITY) {
  const within = rows.filter(({ message }) => message.arrivesAtMs >= fromMs && message.arrivesAtMs < toMs);
  const right = within.filter((row) => row.queue === row.message.trueQueue);
  const routed = within.filter((row) => row.kind === 'routed');
  const routedRight = routed.filter((row) => row.queue === row.message.trueQueue);
  return {
    messages: within.length,
    accuracy: ratio(right.length, within.length),
    held: within.filter((row) => row.kind === 'held').length,
    heldShare: ratio(within.filter((row) => row.kind === 'held').length, within.length),
    routed: routed.length,
    routedRight: routedRight.length,
    routedPrecision: ratio(routedRight.length, routed.length),
    routedPrecisionInterval: wilsonInterval(routedRight.length, routed.length),
  };
}

function ratio(part: number, whole: number): number | null {
  return whole === 0 ? null : part / whole;
}

function groupBy(rows: readonly DemoRow[], nameOf: (row: DemoRow) => string) {
  const groups = new Map<string, DemoRow[]>();
  for (const row of rows) {
    const name = nameOf(row);
    groups.set(name, [...(groups.get(name) ?? []), row]);
  }
  return [...groups].map(([name, members]) => ({
    name,
    ...share(members),
    right: members.filter((row) => row.queue === row.message.trueQueue).length,
  }));
}

function countBy(rows: readonly DemoRow[], nameOf: (row: DemoRow) => string): Record<string, number> {
  const counts: Record<string, number> = {};
  for (const row of rows) counts[nameOf(row)] = (counts[nameOf(row)] ?? 0) + 1;
  return counts;
}

/** First confirmations that were wrong; each was taken out of its column and put into the right one when it was corrected. */
function corrections(rows: readonly DemoRow[]) {
  const corrected = rows.filter(({ message }) => message.confirmations.length > 1);
  return {
    wrongAtFirst: corrected.length,
    never: rows.filter(({ message }) => message.confirmations.length === 0).length,
    confirmed: rows.filter(({ message }) => message.confirmations.length > 0).length,
  };
}

/** How fast a queue is learned that was not there before. */
function opening(rows: readonly DemoRow[], queue: string, atMs: number, before: string) {
  const its = rows.filter(({ message }) => message.trueQueue === queue && message.arrivesAtMs >= atMs);
  const firstRouted = its.find((row) => row.kind === 'routed' && row.queue === queue);
  const confirmedBefore = (untilMs: number) =>
    its.filter(({ message }) =>
      message.confirmations.some((each) => each.atMs < untilMs && each.queue === queue),
    ).length;
  return {
    queue,
    openedAt: new Date(atMs).toISOString(),
    before,
    firstRoutedAfterConfirmations:
      firstRouted === undefined ? null : confirmedBefore(firstRouted.message.arrivesAtMs),
    periods: [
      { period: 'first two weeks', ...share(its, atMs, atMs + 14 * dayMs) },
      { period: 'weeks three to six', ...share(its, atMs + 14 * dayMs, atMs + 42 * dayMs) },
      { period: 'after that', ...share(its, atMs + 42 * dayMs) },
    ],
  };
}
