import { bounds } from '../bounds.ts';
import type { Balance, Evidence } from '../explain/balance.ts';
import { oddsInWords, signedDecibans } from '../explain/odds-words.ts';
import { type Content, html, type Markup, trusted } from '../html/html.ts';
import { plainLine } from '../html/visible-text.ts';
import type { Confirmation } from '../ledger/world.ts';
import type { Message } from '../message/message.ts';
import type { Learned, Likelihood, Likely } from './likelihood.ts';
import { createMarker, wordWeights } from './marked-text.ts';
import { percent } from './percent.ts';
import { settleScript } from './settle-script.ts';
import { settleStyle } from './settle-style.ts';
import type { Waiting } from './waiting.ts';

/** The pages, from values. `base` stands before every path of ours. */

export interface Frame {
  readonly base: string;
  readonly desk: string;
  /** Null before somebody has come in. */
  readonly by: string | null;
}

/** The settlement that can still be taken back, shown above whatever comes next. */
export interface Last {
  readonly confirmation: Confirmation;
  readonly title: string;
  readonly subject: string;
  /** Null where the message can no longer be read. */
  readonly learned: Learned | null;
  readonly token: string;
}

export function listPage(
  frame: Frame,
  waiting: readonly (Waiting & { subject: string; whyWords: string })[],
  total: number,
  last: Last | null,
  nowMs: number,
): string {
  const rest = total - waiting.length;
  return page(
    frame,
    total === 0 ? 'Nothing waits' : `${total.toLocaleString('en-GB')} waiting`,
    html`${last && lastStrip(frame, last)}
<h1>${total === 0 ? 'Nothing waits for a person.' : `${total.toLocaleString('en-GB')} ${total === 1 ? 'message waits' : 'messages wait'} for a person`}</h1>
${total > 0 && html`<p><a data-key="n" href="${frame.base}/next">Begin with the oldest</a> <kbd>n</kbd></p>`}
<ol class="waiting">${waiting.map(
      (
        each,
      ) => html`<li><a href="${messageHref(frame, each.message)}"><span class="quiet">${waited(each.atMs, nowMs)}</span>
<span class="subject">${each.subject}</span><span>${each.whyWords}</span></a></li>`,
    )}</ol>${rest > 0 && html`<p class="quiet">And ${rest.toLocaleString('en-GB')} newer ones.</p>`}`,
  );
}

export interface MessageView {
  readonly waiting: Waiting;
  readonly whyWords: string;
  readonly message: Message;
  readonly likelihood: Likelihood;
  readonly total: number;
  readonly token: string;
  readonly last: Last | null;
  readonly nowMs: number;
  readonly titleOf: (queue: string) => string;
}

export function messagePage(frame: Frame, view: MessageView): string {
  const { waiting, message, likelihood, total, last, nowMs } = view;
  const balance = likelihood.balances[0];
  const mark = createMarker(wordWeights(balance));
  const isForm = message.form !== null && message.subject === '';
  const subject = isForm ? `Form “${plainLine(message.form.id, 100)}”` : messageTitle(message, 200);
  return page(
    frame,
    subject,
    html`${last && lastStrip(frame, last)}
<div class="bench"><article aria-labelledby="subject">
<p class="quiet">${total === 1 ? 'The only one that waits' : `One of ${total.toLocaleString('en-GB')} that wait`}, for ${waited(waiting.atMs, nowMs)}. <strong>${view.whyWords}</strong></p>
<h1 id="subject">${mark(subject)}</h1>
${facts(message, mark)}
${text(message, mark)}
</article>
<div><form method="post" action="${frame.base}/settle" aria-labelledby="where"><h2 id="where">Where does it belong?</h2>
<input type="hidden" name="message" value="${waiting.message}"><input type="hidden" name="token" value="${view.token}">
<ol class="choices">${likelihood.queues.map(choice)}</ol></form>
<p><a data-key="s" href="${frame.base}/next?after=${encodeURIComponent(waiting.message)}">Leave it and go on</a> <kbd>s</kbd></p>
${balance && balanceTable(balance, view.titleOf, true)}
${likelihood.balances[1] && html`<details><summary>And against ${view.titleOf(likelihood.balances[1].rival)}</summary>${balanceTable(likelihood.balances[1], view.titleOf, false)}</details>`}
</div></div>`,
  );
}

/** What the link opens: nothing happens until the person says so, since programs that look at links in mail follow them too. */
export function doorPage(frame: Frame, ticket: string, by: string): string {
  return page(
    frame,
    'Come in',
    html`<form class="door" method="post" action="${frame.base}/enter"><h1>Settle held messages as ${by}</h1>
<p>What you settle will be recorded under this name. The link works once.</p>
<input type="hidden" name="ticket" value="${ticket}"><button autofocus data-key="n">Come in</button></form>`,
  );
}

export function problemPage(frame: Frame, title: string, what: string): string {
  return page(
    frame,
    title,
    html`<h1>${title}</h1><p>${what}</p>${frame.by !== null && html`<p><a data-key="l" href="${frame.base}/">To the list</a></p>`}`,
  );
}

function page({ base, desk, by }: Frame, title: string, content: Content): string {
  return html`<!doctype html>
<html lang="en"><head><meta charset="utf-8"><meta name="viewport" content="width=device-width, initial-scale=1">
<title>${title} · ${desk}</title><style>${trusted(settleStyle)}</style></head>
<body><a class="skip" href="#main">To the message</a>
<header><p><strong>${desk}</strong></p>${
    by !== null &&
    html`<nav aria-label="Pages"><a data-key="l" href="${base}/">The list</a> <kbd>l</kbd></nav><p class="push quiet">${by} <button type="button" id="keys" hidden></button></p>`
  }</header>
<main id="main">${content}</main>
<script>${trusted(settleScript)}</script></body></html>
`.text;
}

function lastStrip({ base }: Frame, { confirmation, title, subject, learned, token }: Last): Markup {
  return html`<form class="last" method="post" action="${base}/undo"><p role="status">You put <em>${subject}</em> to <strong>${title}</strong>.${
    learned !== null &&
    html` ${title} was thought ${percent(learned.before)} likely for it; with this one counted it would be <strong>${percent(learned.after)}</strong>.`
  } <span class="quiet">It is passed on with your next one, or after ten minutes.</span></p><input type="hidden" name="message" value="${confirmation.message}"><input type="hidden" name="token" value="${token}">
<button data-key="u">Take it back <kbd>u</kbd></button></form>`;
}

/** A form's short answers stand with the facts; only what was written at length gets a sheet of its own. */
const shortCharsMax = 80;

function isShort(value: string): boolean {
  return value.length <= shortCharsMax && !value.includes('\n');
}

function facts(message: Message, mark: (text: string) => Content): Markup {
  const rows: [string, Content][] = [];
  const { form, from, recipients, sentAtMs, attachments } = message;
  if (from !== null) rows.push(['From', plainLine(from.address, 300)]);
  if (form === null && recipients.length > 0)
    rows.push([
      'To',
      plainLine(
        recipients
          .slice(0, 3)
          .map(({ address }) => address)
          .join(', '),
        300,
      ),
    ]);
  if (sentAtMs !== null)
    rows.push(['Sent', `${new Date(sentAtMs).toISOString().slice(0, 16).replace('T', ' ')} UTC`]);
  if (attachments.length > 0)
    rows.push([
      'Attached',
      attachments
        .slice(0, 10)
        .map(({ kind, bytes }) => `${kind}, ${Math.ceil(bytes / 1024)} KB`)
        .join('; '),
    ]);
  for (const [name, value] of Object.entries(form?.fields ?? {})) {
    if (isShort(value)) rows.push([plainLine(name, 40), mark(value)]);
  }
  return html`<dl class="facts">${rows.map(([name, value]) => html`<dt>${name}</dt><dd dir="auto">${value}</dd>`)}</dl>`;
}

/** The writer's own words in front, everything else folded away below. */
function text(message: Message, mark: (text: string) => Content): Content {
  if (message.form !== null) {
    return Object.entries(message.form.fields)
      .filter(([, value]) => !isShort(value))
      .map(
        ([name, value]) =>
          html`<h2>${plainLine(name, 100)}</h2><div class="sheet" dir="auto">${mark(value)}</div>`,
      );
  }
  const hasMore = message.text.trim() !== message.ownText.trim();
  return html`<div class="sheet" dir="auto">${message.ownText.trim() === '' ? html`<span class="quiet">No text.</span>` : mark(message.ownText.trim())}</div>
${hasMore && html`<details><summary>All of it, with what was quoted, forwarded or signed</summary><div class="sheet" dir="auto">${mark(message.text.trim())}</div></details>`}`;
}

function choice({ queue, title, probability }: Likely, index: number): Markup {
  const key = index < 9 ? String(index + 1) : '';
  return html`<li><button name="queue" value="${queue}" data-key="${key || 'none'}"><span>${key !== '' && html`<kbd>${key}</kbd>`}</span><span>${title}</span><span class="few">${percent(probability)}</span>
<svg aria-hidden="true"><rect class="bar" height="100%" width="${(probability * 100).toFixed(1)}%"></rect></svg></button></li>`;
}

function balanceTable(balance: Balance, titleOf: (queue: string) => string, isFirst: boolean): Markup {
  const [one, two] = [titleOf(balance.queue), titleOf(balance.rival)];
  const items = balance.groups
    .flatMap((group) => group.items)
    .filter((item) => item.kind === 'word' || item.kind === 'circumstance')
    .sort((a, b) => Math.abs(b.decibans) - Math.abs(a.decibans))
    .slice(0, bounds.settleEvidenceMax);
  const most = Math.max(
    1,
    ...items.map((item) => Math.abs(item.decibans)),
    ...balance.groups.map((group) => Math.abs(group.decibans)),
  );
  const leaning = balance.decibans >= 0 ? one : two;
  return html`<h2>What speaks for which</h2>
<p class="legend">${isFirst && html`In the text, <mark class="one w2">this line</mark> speaks for ${one}, <mark class="two w2">this one</mark> for ${two}. `}All together: ${oddsInWords(balance.decibans)}${Math.abs(balance.decibans) >= 0.6 && ` for ${leaning}`}. </p>
<table class="balance"><caption>Bars to the right speak for ${one}, to the left for ${two}. Ten points are odds of 10 to 1.</caption>
<thead class="unseen"><tr><th scope="col">Evidence</th><th scope="col">For ${two} or ${one}</th><th scope="col">Points</th></tr></thead>
<tbody>${balance.groups.map((group) => row(group.title, group.decibans, most, true))}</tbody>
<tbody><tr class="sum"><th scope="colgroup" colspan="3">The strongest single ones</th></tr>${items.map((item) => row(labelOf(item), item.decibans, most, false))}</tbody></table>`;
}

function labelOf(item: Evidence): string {
  return item.kind === 'word' ? `“${plainLine(item.label, 40)}”` : plainLine(item.label, 80);
}

function row(label: string, decibans: number, most: number, isSum: boolean): Markup {
  const width = (50 * Math.abs(decibans)) / most;
  const x = decibans >= 0 ? 50 : 50 - width;
  return html`<tr class="${isSum ? 'group' : 'item'}"><th scope="row">${label}</th><td class="pic"><svg aria-hidden="true"><rect class="${decibans >= 0 ? 'f-one' : 'f-two'}" x="${x.toFixed(1)}%" width="${Math.max(0.5, width).toFixed(1)}%" y="2" height="9"></rect><line class="axis" x1="50%" x2="50%" y1="0" y2="100%"></line></svg></td><td class="n">${signedDecibans(decibans)}</td></tr>`;
}

/** What stands for a message in one line. */
export function messageTitle(message: Message | null, charsMax: number): string {
  if (message === null) return 'a message that is gone';
  const subject = plainLine(message.subject, charsMax);
  if (subject !== '') return subject;
  const start = plainLine(message.ownText, charsMax);
  if (message.form !== null)
    return plainLine(`Form “${message.form.id}”${start === '' ? '' : `: ${start}`}`, charsMax);
  return start === '' ? 'No subject, no text' : start;
}

export function messageHref({ base }: Frame, message: string): string {
  return `${base}/message?m=${encodeURIComponent(message)}`;
}

function waited(atMs: number, nowMs: number): string {
  const hours = Math.floor((nowMs - atMs) / 3_600_000);
  if (hours < 1) return 'under an hour';
  if (hours < 48) return `${hours} ${hours === 1 ? 'hour' : 'hours'}`;
  return `${Math.floor(hours / 24)} days`;
}
