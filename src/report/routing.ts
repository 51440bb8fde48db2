import { estimate } from './estimate.ts';
import type { CurvePoint, Routing } from './report-data.ts';
import { type Judged, judged, type Seen } from './seen.ts';

export interface RoutingCosts {
  readonly lookMinutes: number;
  /** Minutes lost by a wrong route into this queue. */
  readonly wrongRouteMinutes: (queue: string) => number;
}

const pointsMax = 160;

/** What could have been routed at which precision, and what today's decisions cost: judged by what was confirmed. */
export function weighRouting(seen: readonly Seen[], costs: RoutingCosts): Routing {
  const all = judged(seen).sort((a, b) => b.posterior - a.posterior || (a.message < b.message ? -1 : 1));
  const routed = all.filter((each) => each.kind === 'routed');
  const right = estimate(routed.filter(isRight).length, routed.length);
  const today = { share: all.length === 0 ? 0 : routed.length / all.length, right };
  if (all.length === 0) return { judged: 0, curve: [], today, cheapest: null, minutesPer1000: null };

  const curve: CurvePoint[] = [];
  const lookAtEach = all.length * costs.lookMinutes;
  let best = { index: -1, minutes: lookAtEach, right: 0 };
  let hits = 0;
  let wrongMinutes = 0;
  all.forEach((each, i) => {
    if (isRight(each)) hits += 1;
    else wrongMinutes += costs.wrongRouteMinutes(each.queue);
    // Messages of one probability are routed together or not at all.
    if (all[i + 1]?.posterior === each.posterior) return;
    const minutes = wrongMinutes + (all.length - i - 1) * costs.lookMinutes;
    if (minutes < best.minutes) best = { index: i, minutes, right: hits };
    curve.push({ share: (i + 1) / all.length, right: hits / (i + 1), probability: each.posterior });
  });
  const todayMinutes = all.reduce((sum, each) => {
    if (each.kind === 'held') return sum + costs.lookMinutes;
    return isRight(each) ? sum : sum + costs.wrongRouteMinutes(each.queue);
  }, 0);
  const per1000 = (minutes: number) => (1000 * minutes) / all.length;
  return {
    judged: all.length,
    curve: thinned(curve),
    today,
    cheapest:
      best.index < 0
        ? null
        : {
            share: (best.index + 1) / all.length,
            right: best.right / (best.index + 1),
            probability: (all[best.index] as Judged).posterior,
          },
    minutesPer1000: {
      lookAtEach: per1000(lookAtEach),
      today: per1000(todayMinutes),
      cheapest: per1000(best.minutes),
    },
  };
}

function isRight(each: Judged): boolean {
  return each.queue === each.confirmed.queue;
}

/** Evenly by share; the last point stays. */
function thinned(curve: readonly CurvePoint[]): CurvePoint[] {
  const kept: CurvePoint[] = [];
  for (const point of curve) {
    if (point.share * pointsMax >= kept.length + 1 || point === curve.at(-1)) kept.push(point);
  }
  return kept;
}
