import { type Content, html, type Markup, trusted } from '../html/html.ts';
import { strictPolicy } from '../html/policy.ts';
import { plainLine } from '../html/visible-text.ts';
import * as answers from './answers.ts';
import {
  bar,
  heldLine,
  isDiamondShown,
  keySwatch,
  patterns,
  promiseRow,
  routingCurve,
  tallyMark,
  volumeColumns,
} from './charts.ts';
import type { ReportData } from './report-data.ts';
import { reportStyle } from './report-style.ts';
import { count, day, inHundred, minutes, percent, plural, shortDay, size } from './words-for-numbers.ts';

/** The report as one page that needs nothing else: no script, no request, its style allowed by its hash. */
export function reportPage(data: ReportData): string {
  const views = [promises, routing, corrections, volume, drift, secondLook, newQueues, health].map((view) =>
    view(data),
  );
  return html`<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="${strictPolicy({ style: reportStyle })}">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="referrer" content="no-referrer">
<title>${data.desk}: how the routing does, ${day(data.madeAt)}</title>
<style>${trusted(reportStyle)}</style>
</head>
<body>
${patterns}
<header>${tallyMark}<h1>${data.desk}: how the routing does</h1>
<p class="quiet">${day(data.madeAt)}. ${lookedAt(data)}</p></header>
<main>${first(data)}${views}</main>
<footer><p class="quiet">Model version ${data.modelVersion}. The numbers of this page lie beside it as JSON.</p></footer>
</body>
</html>
`.text;
}

function lookedAt({ looked }: ReportData): string {
  if (looked.from === null || looked.to === null) return 'No message has been decided on yet.';
  const which = looked.isAll
    ? `All ${plural(looked.messages, 'message')}`
    : `The newest ${plural(looked.messages, 'message')}`;
  return `${which} from ${day(looked.from)} to ${day(looked.to)}, ${count(looked.confirmed)} of them confirmed by people.`;
}

function first(data: ReportData): Markup {
  const tasks = answers.tasksOf(data);
  return html`<section class="first" aria-labelledby="first"><div><h2 id="first">How far can it be trusted?</h2>
<p class="answer">${answers.trustAnswer(data)}</p>
<p>${answers.promisesAnswer(data)}</p>
<p>${answers.volumeAnswer(data)}</p></div>
<div><h2>What to do next</h2>${
    tasks.length === 0
      ? html`<p>Nothing needs doing.</p>`
      : html`<ol>${tasks.map((task) => html`<li><a href="#${task.anchor}">${task.text}</a>${task.command !== '' && html`<br><code>${task.command}</code>`}</li>`)}</ol>`
  }</div></section>`;
}

function view(id: string, question: string, answer: Content, picture: Content): Markup {
  return html`<section class="view" aria-labelledby="${id}"><div><h2 id="${id}">${question}</h2>${answer}</div><div>${picture}</div></section>`;
}

function promises(data: ReportData): Markup {
  const rows = data.promises.bands.map(
    (
      band,
    ) => html`<tr><th scope="row" class="name">${answers.saidOf(band)}</th><td class="pic">${promiseRow(band)}</td>
<td class="n">${percent(band.cameTrue.share ?? 0)}</td><td class="n">${count(band.cameTrue.of)}</td></tr>`,
  );
  return view(
    'promises',
    'Did it come true?',
    html`<p class="answer">${answers.promisesAnswer(data)}</p><p>${answers.auditAnswer(data)}</p>`,
    rows.length === 0
      ? html`<p class="quiet">Nothing to show yet.</p>`
      : html`<table><caption>Each row is a range of what it said. The grey bar is that range from 0 to 100 %, the point is what came true, the line through it allows for chance. A point on its bar is a promise kept.</caption>
<thead><tr><th scope="col">It said</th><th scope="col">0 to 100 %</th><th scope="col" class="n">Came true</th><th scope="col" class="n">Messages</th></tr></thead><tbody>${rows}</tbody></table>`,
  );
}

function routing(data: ReportData): Markup {
  const { curve, cheapest, minutesPer1000, today } = data.routing;
  const label = `Share right against share routed: ${answers.routingAnswer(data)}`;
  const most = minutesPer1000 && Math.max(...Object.values(minutesPer1000));
  const bars =
    minutesPer1000 &&
    ([
      ['Looking at each', minutesPer1000.lookAtEach, 'held'],
      ['Today’s rule', minutesPer1000.today, 'routed'],
      ['The cheapest limit, in hindsight', minutesPer1000.cheapest, 'routed'],
    ] as const);
  return view(
    'routing',
    'How much can go without a look?',
    html`<p class="answer">${answers.routingAnswer(data)}</p><p>${answers.cheapestAnswer(data)}</p>`,
    curve.length === 0
      ? html`<p class="quiet">Nothing to show yet.</p>`
      : html`<figure>${routingCurve(data.routing, label)}<figcaption>Across: share routed by itself. Up: share of those that was right.
${today.right.share !== null && 'The point is today’s rule. '}${cheapest && (isDiamondShown(data.routing) ? html`The diamond is the single limit (${percent(cheapest.probability)}) that would have cost least.` : html`The single limit that would have cost least (${percent(cheapest.probability)}) lies beside it.`)}</figcaption></figure>
<h3>Staff time for a thousand messages</h3><ul class="bars">${(bars || []).map(
          ([name, value, kind]) =>
            html`<li><span class="number">${minutes(value)}</span>${name}<svg aria-hidden="true">${bar(value / (most || 1), kind)}</svg></li>`,
        )}</ul>
<details><summary>The curve as numbers</summary><table><thead><tr><th scope="col" class="n">Routed</th><th scope="col" class="n">Right</th><th scope="col" class="n">All above</th></tr></thead>
<tbody>${everyTenth(curve).map((point) => html`<tr><td class="n">${percent(point.share)}</td><td class="n">${percent(point.right)}</td><td class="n">${percent(point.probability)}</td></tr>`)}</tbody></table></details>`,
  );
}

function everyTenth<T>(points: readonly T[]): T[] {
  const every = Math.max(1, Math.ceil(points.length / 12));
  return points.filter((_, i) => i % every === every - 1 || i === points.length - 1);
}

function corrections(data: ReportData): Markup {
  const pairs = data.corrections.pairs.slice(0, 12);
  const most = Math.max(1, ...pairs.map((pair) => pair.routed + pair.held));
  const rest = data.corrections.pairs.length - pairs.length;
  return view(
    'corrections',
    'Which queues are mistaken for one another?',
    html`<p class="answer">${answers.correctionsAnswer(data)}</p>`,
    pairs.length === 0
      ? html`<p class="quiet">Nothing to show.</p>`
      : html`<ul class="key"><li>${keySwatch('routed')}routed by itself</li><li>${keySwatch('held')}held, and another queue thought likeliest</li></ul>
<ul class="bars">${pairs.map(
          (
            pair,
          ) => html`<li><span class="number">${pair.routed} routed, ${pair.held} held</span>${answers.titleOf(data, pair.from)} → ${answers.titleOf(data, pair.to)}
<svg aria-hidden="true">${pair.routed > 0 && bar(pair.routed / most)}${pair.held > 0 && bar(pair.held / most, 'held', pair.routed / most)}</svg></li>`,
        )}</ul>${rest > 0 && html`<p class="quiet">${plural(rest, 'further pair')}, all rarer.</p>`}`,
  );
}

function volume(data: ReportData): Markup {
  const { steps, step } = data.volume;
  const answer = answers.volumeAnswer(data);
  return view(
    'volume',
    'How much comes in, and how much of it waits?',
    html`<p class="answer">${answer}</p>`,
    steps.length === 0
      ? html`<p class="quiet">Nothing to show yet.</p>`
      : html`<ul class="key"><li>${keySwatch('routed')}routed</li><li>${keySwatch('guarded')}sent on by a fixed rule</li><li>${keySwatch('held')}held for a person</li></ul>
<figure>${volumeColumns(data.volume, `Messages by ${step}. ${answer}`)}<figcaption>Messages a ${step}; the first and the last ${step} may be cut short.</figcaption></figure>
<figure>${heldLine(data.volume, `Share held by ${step}.`)}<figcaption>Share held, by ${step}.</figcaption></figure>
<details><summary>As numbers</summary><table><thead><tr><th scope="col">${step === 'week' ? 'Week from' : 'Day'}</th><th scope="col" class="n">Routed</th><th scope="col" class="n">By rule</th><th scope="col" class="n">Held</th></tr></thead>
<tbody>${steps.map((each) => html`<tr><th scope="row">${shortDay(each.from)}</th><td class="n">${each.routed}</td><td class="n">${each.guarded}</td><td class="n">${each.held}</td></tr>`)}</tbody></table></details>`,
  );
}

function drift(data: ReportData): Markup {
  const most = Math.max(1, ...data.drift.map((each) => each.decibans));
  return view(
    'drift',
    'What is new?',
    html`<p class="answer">${answers.driftAnswer(data)}</p>`,
    data.drift.length === 0
      ? html`<p class="quiet">Nothing to show.</p>`
      : html`<ul class="bars">${data.drift.slice(0, 20).map(
          (
            each,
          ) => html`<li><span class="number">${strength(each.decibans)}</span>${answers.titleOf(data, each.queue)}
<svg aria-hidden="true">${bar(each.decibans / most)}</svg>
${
  each.words.length > 0
    ? html`<span class="words">${each.words.map((word) => plainLine(word, 40)).join(', ')}</span> <span class="quiet">come more often in ${plural(each.recentMessages, 'message')} since ${shortDay(each.since)} than in ${count(each.earlierMessages)} before.</span>`
    : html`<span class="quiet">${plural(each.recentMessages, 'message')} since ${shortDay(each.since)}; none of those that hold the new words is left to read.</span>`
}</li>`,
        )}</ul><p class="quiet">The longer the bar, the surer the change.</p>`,
  );
}

function strength(decibans: number): string {
  return decibans >= 30 ? 'certain' : decibans >= 20 ? 'very likely' : 'likely';
}

function surely(decibans: number): string {
  return decibans >= 60 ? 'almost certainly' : decibans >= 40 ? 'very likely' : 'likely';
}

function secondLook(data: ReportData): Markup {
  return view(
    'second-look',
    'Which confirmations should somebody look at again?',
    html`<p class="answer">${answers.secondLookAnswer(data)}</p>`,
    data.secondLook.length === 0
      ? html`<p class="quiet">Nothing to show.</p>`
      : html`<div class="wide" tabindex="0" role="region" aria-label="Confirmations worth a second look"><table><thead><tr><th scope="col">Message</th><th scope="col">Confirmed as</th><th scope="col">Everything else says</th><th scope="col">By, on</th></tr></thead>
<tbody>${data.secondLook.map(
          (
            each,
          ) => html`<tr><th scope="row"><code>${plainLine(each.message, 80)}</code></th><td>${answers.titleOf(data, each.confirmed)}</td>
<td>${answers.titleOf(data, each.likelier)} (${inHundred(each.likelierProbability)})</td><td>${plainLine(each.by, 40)}, ${shortDay(each.at)}</td></tr>`,
        )}</tbody></table></div><p class="quiet">To see why: <code>tallypost explain MESSAGE --store STORE</code>. To put it right: confirm it again.</p>`,
  );
}

function newQueues(data: ReportData): Markup {
  return view(
    'new-queue',
    'Is something coming in that has no queue yet?',
    html`<p class="answer">${answers.newQueuesAnswer(data)}</p>`,
    data.newQueues.length === 0
      ? html`<p class="quiet">Nothing to show.</p>`
      : data.newQueues.map(
          (group, i) => html`<h3>Group ${i + 1}: ${plural(group.messages.length, 'message')}</h3>
<p>${group.words.length > 0 ? html`Typical words: <span class="words">${group.words.map((word) => plainLine(word, 40)).join(', ')}</span>.` : 'None of these messages is left to read.'}
A queue of their own is ${surely(group.decibans)} the better account of them.</p>
<p class="quiet">To open one and confirm these messages for it: <code>tallypost queue open ID --title TITLE --proposal ${i + 1} --store STORE</code></p>
<details><summary>The messages</summary><ul>${group.messages.map((message) => html`<li><code>${plainLine(message, 80)}</code></li>`)}</ul></details>`,
        ),
  );
}

function health(data: ReportData): Markup {
  const { health: state } = data;
  const most = Math.max(0.01, ...state.weights.map((each) => each.exponent));
  return view(
    'health',
    'Is the table sound?',
    html`<p class="answer ${state.faults.length > 0 ? 'unsound' : 'sound'}">${answers.healthAnswer(data)}</p>`,
    html`<dl><dt>Confirmed messages in it</dt><dd>${count(state.messages)}</dd><dt>Counts kept</dt><dd>${count(state.cells)}</dd>
<dt>Size</dt><dd>${size(state.tableBytes)}</dd><dt>Compacted</dt><dd>${state.compactedAt === null ? 'not yet' : day(state.compactedAt)}</dd>
<dt>Batches since</dt><dd>${count(state.segments)}</dd>
<dt>Tuned on</dt><dd>${state.fit.messages === 0 ? 'nothing yet: it works with what it started with' : plural(state.fit.messages, 'message')}</dd></dl>
<h3>What counts how much</h3><p class="quiet">Tuned on what was confirmed: 0 counts for nothing, 1 at face value, 2 doubly.</p><ul class="bars">${state.weights
      .filter((each) => each.exponent > 0.005)
      .map(
        (each) =>
          html`<li><span class="number">${each.exponent.toFixed(2)}</span>${each.what}<svg aria-hidden="true">${bar(each.exponent / most)}</svg></li>`,
      )}</ul>`,
  );
}
