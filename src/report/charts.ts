import { scaleLinear } from 'd3-scale';
import { line, stack, symbol, symbolDiamond } from 'd3-shape';
import { type Content, html, type Markup, trusted } from '../html/html.ts';
import type { CurvePoint, PromiseBand, Routing, Volume } from './report-data.ts';
import { percent, shortDay } from './words-for-numbers.ts';

/** Pictures as SVG that stretches with its place: positions are shares of the width, text keeps its size. */

const pc = (value: number) => `${Number(value.toFixed(2))}%`;

/** Pattern of what is held: hatched, so that it can be told apart without colour. Once a page. */
export const patterns: Markup = trusted(
  '<svg width="0" height="0" aria-hidden="true" focusable="false"><defs><pattern id="held" width="6" height="6" patternUnits="userSpaceOnUse" patternTransform="rotate(45)"><rect class="f-held-solid" width="3" height="6"></rect></pattern></defs></svg>',
);

export const tallyMark: Markup = trusted(
  '<svg class="tally" viewBox="0 0 44 30" aria-hidden="true"><path d="M6 4v22M14 4v22M22 4v22M30 4v22M2 24 38 6"></path></svg>',
);

/** One row of the picture of promises: the range said as a bar, what came true as a point with its interval. */
export function promiseRow({ from, to, cameTrue, verdict }: PromiseBand): Markup {
  const x = scaleLinear([0, 1], [0, 100]);
  const isBroken = verdict === 'too-high' || verdict === 'too-low';
  return html`<svg aria-hidden="true" class="${isBroken ? 'broken' : 'kept'}">
<line class="grid" x1="0" x2="100%" y1="50%" y2="50%"></line>
<rect class="said" x="${pc(x(from))}" width="${pc(Math.max(0.8, x(to) - x(from)))}" y="15%" height="70%"></rect>
<line class="whisker" x1="${pc(x(cameTrue.low))}" x2="${pc(x(cameTrue.high))}" y1="50%" y2="50%"></line>
<circle class="dot" cx="${pc(x(cameTrue.share ?? 0))}" cy="50%" r="6"></circle></svg>`;
}

/** Share routed against share right; today's rule and the cheapest limit marked. */
export function routingCurve(routing: Routing, label: string): Markup {
  const { curve, today, cheapest } = routing;
  const lowest = Math.min(...curve.map((point) => point.right), today.right.share ?? 1);
  const y = scaleLinear([Math.min(0.9, Math.floor(lowest * 20) / 20), 1], [100, 0]);
  const x = scaleLinear([0, 1], [0, 100]);
  const path =
    line<CurvePoint>(
      (point) => x(point.share),
      (point) => y(point.right),
    )(curve) ?? '';
  const rows = y.ticks(5).map(
    (tick) => html`<line class="grid" x1="0" x2="100%" y1="${pc(y(tick))}" y2="${pc(y(tick))}"></line>
<text class="dim" x="-8" y="${pc(y(tick))}" dy="4" text-anchor="end">${percent(tick)}</text>`,
  );
  const columns = x
    .ticks(5)
    .map(
      (tick) =>
        html`<text class="dim" x="${pc(x(tick))}" y="100%" dy="20" text-anchor="middle">${percent(tick)}</text>`,
    );
  const todayAt = today.right.share === null ? null : { x: x(today.share), y: y(today.right.share) };
  return plot(
    label,
    html`${rows}${columns}<line class="axis" x1="0" x2="100%" y1="100%" y2="100%"></line>
<svg width="100%" height="100%" viewBox="0 0 100 100" preserveAspectRatio="none" overflow="visible"><path class="curve" d="${path}"></path></svg>
${isDiamondShown(routing) && cheapest && html`<svg x="${pc(x(cheapest.share))}" y="${pc(y(cheapest.right))}" overflow="visible"><path class="diamond" d="${symbol(symbolDiamond, 110)() ?? ''}"></path></svg>`}
${
  todayAt &&
  html`<circle class="dot" cx="${pc(todayAt.x)}" cy="${pc(todayAt.y)}" r="8"></circle>
<text x="${pc(todayAt.x)}" y="${pc(todayAt.y)}" dx="-12" dy="18" text-anchor="end">today</text>`
}`,
  );
}

/** Beside the point of today's rule it could not be told apart. */
export function isDiamondShown({ cheapest, today }: Routing): boolean {
  return cheapest !== null && Math.abs(cheapest.share - today.share) > 0.03;
}

const kinds = ['routed', 'guarded', 'held'] as const;

/** Columns of what came in, by what became of it. */
export function volumeColumns({ steps }: Volume, label: string): Markup {
  const totals = steps.map((each) => each.routed + each.guarded + each.held);
  const y = scaleLinear([0, Math.max(1, ...totals)], [100, 0]).nice(4);
  const width = 100 / steps.length;
  const rows = y.ticks(4).map(
    (tick) => html`<line class="grid" x1="0" x2="100%" y1="${pc(y(tick))}" y2="${pc(y(tick))}"></line>
<text class="dim" x="-8" y="${pc(y(tick))}" dy="4" text-anchor="end">${tick}</text>`,
  );
  const layers = stack<unknown, (typeof steps)[number], (typeof kinds)[number]>()
    .keys([...kinds])
    .value((each, key) => each[key])(steps);
  const columns = layers.map((layer) =>
    layer.map(([from, to], i) => {
      if (to === from) return null;
      const place = html`x="${pc(i * width + width * 0.12)}" width="${pc(width * 0.76)}" y="${pc(y(to))}" height="${pc(y(from) - y(to))}"`;
      return html`<rect class="f-${layer.key}" ${place}></rect>${layer.key === 'held' && html`<rect class="edge" ${place}></rect>`}`;
    }),
  );
  return plot(
    label,
    html`${rows}${columns}${dates(steps)}<line class="axis" x1="0" x2="100%" y1="100%" y2="100%"></line>`,
  );
}

/** The share held, below the columns on the same days. */
export function heldLine({ steps }: Volume, label: string): Markup {
  const shares = steps.map((each) => {
    const total = each.routed + each.guarded + each.held;
    return total === 0 ? null : each.held / total;
  });
  const y = scaleLinear([0, Math.max(0.1, ...shares.map((share) => share ?? 0))], [100, 0]).nice(2);
  const width = 100 / steps.length;
  const path =
    line<number | null>(
      (_, i) => (i + 0.5) * width,
      (share) => y(share ?? 0),
    ).defined((share) => share !== null)(shares) ?? '';
  const rows = y.ticks(2).map(
    (tick) => html`<line class="grid" x1="0" x2="100%" y1="${pc(y(tick))}" y2="${pc(y(tick))}"></line>
<text class="dim" x="-8" y="${pc(y(tick))}" dy="4" text-anchor="end">${percent(tick)}</text>`,
  );
  return plot(
    label,
    html`${rows}<svg width="100%" height="100%" viewBox="0 0 100 100" preserveAspectRatio="none" overflow="visible"><path class="curve s-held" d="${path}"></path></svg>${dates(steps)}`,
    'low',
  );
}

/** Dates under every so many columns, few enough to be read on a narrow screen. */
function dates(steps: Volume['steps']): Content {
  const width = 100 / steps.length;
  const every = Math.max(1, Math.ceil(steps.length / 4));
  return steps.map(
    (each, i) =>
      i % every === 0 &&
      html`<text class="dim" x="${pc((i + 0.5) * width)}" y="100%" dy="20" text-anchor="middle">${shortDay(each.from)}</text>`,
  );
}

/** A bar of a share of the full width. */
export function bar(share: number, kind: 'routed' | 'held' | 'guarded' = 'routed', from = 0): Markup {
  const place = html`x="${pc(from * 100)}" width="${pc(Math.max(0.3, share * 100))}" y="0" height="100%"`;
  return html`<rect class="f-${kind}" ${place}></rect>${kind === 'held' && html`<rect class="edge" ${place}></rect>`}`;
}

export function keySwatch(kind: 'routed' | 'held' | 'guarded'): Markup {
  return html`<svg aria-hidden="true">${bar(1, kind)}</svg>`;
}

function plot(label: string, inside: Content, kind = ''): Markup {
  return html`<div class="plot"><svg class="area ${kind}" role="img" aria-label="${label}">${inside}</svg></div>`;
}
