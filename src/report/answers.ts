import type { PromiseBand, ReportData } from './report-data.ts';
import { ago, count, inHundred, listed, minutes, percent, plural, shortDay } from './words-for-numbers.ts';

/** Each view's answer in words: what the picture shows, and what to make of it. */

/** In sentences titles stand in quotes: many hold an “and”. */
function quoted(data: ReportData, queue: string): string {
  return `“${titleOf(data, queue)}”`;
}

export function titleOf(data: ReportData, queue: string): string {
  return data.queues.find((each) => each.id === queue)?.title ?? queue;
}

export function trustAnswer({ routing }: ReportData): string {
  const { right } = routing.today;
  if (right.share === null)
    return 'Nothing that was routed has been confirmed yet, so nobody can say how far to trust it.';
  return (
    `Of ${plural(right.of, 'message')} that it routed by itself and that people confirmed since, ${inHundred(right.share)} were right` +
    ` (between ${percent(right.low)} and ${percent(right.high)}, allowing for chance).`
  );
}

export function promisesAnswer({ promises }: ReportData): string {
  const judged = promises.bands.filter((band) => band.verdict !== 'too-few');
  if (judged.length === 0)
    return 'Too few messages are confirmed to tell whether its probabilities come true.';
  const high = judged.filter((band) => band.verdict === 'too-high');
  const low = judged.filter((band) => band.verdict === 'too-low');
  if (high.length + low.length === 0)
    return 'Its probabilities can be taken at their word: where it said 90 in 100, about that many came true.';
  return [
    high.length > 0 &&
      `It was too sure of itself where it said ${listed(high.map(saidOf))}: fewer came true than it said.`,
    low.length > 0 && `It was more often right than it said where it said ${listed(low.map(saidOf))}.`,
    judged.length > high.length + low.length && 'Elsewhere its probabilities came true.',
  ]
    .filter((sentence) => sentence !== false)
    .join(' ');
}

export function saidOf({ from, to }: PromiseBand): string {
  if (from === 0) return `under ${edge(to)}\u00a0%`;
  return to === 1 ? `over ${edge(from)}\u00a0%` : `${edge(from)} to ${edge(to)}\u00a0%`;
}

function edge(probability: number): string {
  const hundred = probability * 100;
  return hundred > 99 ? hundred.toFixed(2).replace(/0$/, '') : String(Math.round(hundred));
}

export function auditAnswer({ promises: { audit } }: ReportData): string {
  if (audit.share === null)
    return 'No messages were drawn at random for a look, so this rests on what people happened to confirm.';
  return `Among ${plural(audit.of, 'message')} drawn at random for a look, ${inHundred(audit.share)} were right (${percent(audit.low)} to ${percent(audit.high)}); that figure is free of what people happen to check.`;
}

export function routingAnswer({ routing, costs }: ReportData): string {
  const { today, minutesPer1000 } = routing;
  if (minutesPer1000 === null || today.right.share === null) return 'Nothing confirmed yet to weigh.';
  const saved = minutesPer1000.lookAtEach - minutesPer1000.today;
  return (
    `Today’s rule routes ${inHundred(today.share)} by itself. A thousand messages cost ${minutes(minutesPer1000.today)} of staff time` +
    ` instead of ${minutes(minutesPer1000.lookAtEach)} for looking at each (${plural(costs.lookMinutes, 'minute')} a look): ` +
    (saved >= 0 ? `${minutes(saved)} saved.` : `${minutes(-saved)} lost.`)
  );
}

export function cheapestAnswer({ routing: { cheapest, today, minutesPer1000 } }: ReportData): string {
  if (cheapest === null || minutesPer1000 === null) return '';
  const gain = minutesPer1000.today - minutesPer1000.cheapest;
  const isNear = gain < 0.05 * minutesPer1000.lookAtEach;
  return isNear
    ? 'No single limit of probability would have cost noticeably less: today’s rule is about where it should be.'
    : `In hindsight, routing everything above ${percent(cheapest.probability)} (${inHundred(cheapest.share)} of all) would have cost ${minutes(gain)} less a thousand; today it routes ${inHundred(today.share)}.`;
}

export function correctionsAnswer(data: ReportData): string {
  const { pairs, routedWrong, heldWrong, revised } = data.corrections;
  const first = pairs[0];
  if (first === undefined) return 'Nobody moved a message to another queue.';
  const share = (first.routed + first.held) / Math.max(1, routedWrong + heldWrong);
  return (
    `People moved ${plural(routedWrong, 'routed message')} to another queue, and chose another than the likeliest for ${plural(heldWrong, 'held one')}.` +
    ` Most often from ${quoted(data, first.from)} to ${quoted(data, first.to)} (${inHundred(share)} of all).` +
    (revised > 0 ? ` For ${plural(revised, 'message')} people changed what they had confirmed before.` : '')
  );
}

export function volumeAnswer({ volume, waiting, madeAt }: ReportData): string {
  const total = volume.steps.reduce((sum, step) => sum + step.routed + step.guarded + step.held, 0);
  const held = volume.steps.reduce((sum, step) => sum + step.held, 0);
  if (total === 0) return 'Nothing has come in yet.';
  const [early, late] = [heldShare(volume.steps.slice(0, 3)), heldShare(volume.steps.slice(-3))];
  const trend =
    volume.steps.length < 6 || early === null || late === null || Math.abs(early - late) < 0.03
      ? ''
      : ` At the beginning ${inHundred(early)} were held, lately ${inHundred(late)}.`;
  const waits =
    waiting.messages === 0 || waiting.oldestAt === null
      ? ' None waits now.'
      : ` ${plural(waiting.messages, 'held message waits', 'held messages wait')} now, the oldest for ${ago(waiting.oldestAt, madeAt)}.`;
  return `Of ${plural(total, 'message')}, ${inHundred(held / total)} were held for a person.${trend}${waits}`;
}

function heldShare(steps: ReportData['volume']['steps']): number | null {
  const total = steps.reduce((sum, step) => sum + step.routed + step.guarded + step.held, 0);
  return total === 0 ? null : steps.reduce((sum, step) => sum + step.held, 0) / total;
}

export function driftAnswer(data: ReportData): string {
  if (data.drift.length === 0)
    return 'In no queue do the words of the last two weeks differ from before by more than chance.';
  const names = data.drift.map((each) => quoted(data, each.queue));
  return `Since ${shortDay(data.drift[0]!.since)} people write in other words to ${listed(names)}. It learns them by itself; somebody may want to know why.`;
}

export function secondLookAnswer({ secondLook }: ReportData): string {
  if (secondLook.length === 0) return 'No confirmation stands out against all others.';
  return `${plural(secondLook.length, 'confirmation goes', 'confirmations go')} against everything else that was confirmed. Some will be slips of the hand, which teach it wrongly; some will be right, and rare.`;
}

export function newQueuesAnswer({ newQueues }: ReportData): string {
  if (newQueues.length === 0)
    return 'No group of held messages would be better explained by a queue of its own.';
  const messages = newQueues.reduce((sum, group) => sum + group.messages.length, 0);
  return `${plural(messages, 'held message')} in ${plural(newQueues.length, 'group')} would be better explained by a queue of their own than by any that there is.`;
}

export function healthAnswer({ health }: ReportData): string {
  if (health.faults.length > 0) return `The table is not sound: ${listed(health.faults)}.`;
  const counted =
    health.recount === null
      ? 'its sums agree; the full recount was not run this time'
      : `counted again from ${plural(health.recount.messages, 'confirmation')}, every cell agrees`;
  return `The table is sound: ${counted}.`;
}

export interface Task {
  readonly anchor: string;
  readonly text: string;
  readonly command: string;
}

/** What to do next, most pressing first; at most four. */
export function tasksOf(data: ReportData): Task[] {
  const { health, waiting, newQueues, secondLook, promises, madeAt } = data;
  const tasks: (Task | false)[] = [
    health.faults.length > 0 && {
      anchor: 'health',
      text: 'Repair the table before anything else: it cannot be trusted as it is.',
      command: 'tallypost recount --repair --store STORE',
    },
    waiting.messages > 0 &&
      waiting.oldestAt !== null && {
        anchor: 'volume',
        text: `Settle ${plural(waiting.messages, 'held message')}; the oldest has waited ${ago(waiting.oldestAt, madeAt)}.`,
        command: 'tallypost settle --store STORE',
      },
    newQueues.length > 0 && {
      anchor: 'new-queue',
      text: `Decide whether ${plural(newQueues[0]!.messages.length, 'held message')} about ${listed(newQueues[0]!.words.slice(0, 3).map((word) => `“${word}”`))} deserve a queue of their own.`,
      command: '',
    },
    secondLook.length > 0 && {
      anchor: 'second-look',
      text: `Look again at ${plural(secondLook.length, 'confirmation')} that everything else contradicts.`,
      command: '',
    },
    promises.bands.some((band) => band.verdict === 'too-high') && {
      anchor: 'promises',
      text: 'Have more of what it routes looked at: it promised too much somewhere.',
      command: '',
    },
    data.drift.length > 0 && {
      anchor: 'drift',
      text: `Ask ${quoted(data, data.drift[0]!.queue)} what is new there.`,
      command: '',
    },
    data.looked.confirmed < 100 && {
      anchor: 'promises',
      text: `Confirm more: ${count(data.looked.confirmed)} confirmed messages are too few to tell much.`,
      command: '',
    },
  ];
  return tasks.filter((task) => task !== false).slice(0, 4);
}
