import type { Chance } from './random.ts';
import type { QueueId } from './topic.ts';

export const dayMs = 24 * 3600 * 1000;
/** Monday. */
export const startsAtMs = Date.UTC(2026, 0, 5);
export const scenarioDays = 120;
/** The queue of new connections opens on this day; until then moving-home answers such letters. */
export const newConnectionsOpenDay = 50;
export const campaign = { fromDay: 64, toDay: 104 } as const;
export const visitsFromDay = 96;
/** Summer time in the district begins then: last Sunday of March 2026, 01:00 UTC. */
const summerTimeAtMs = Date.UTC(2026, 2, 29, 1);

export function utcOffsetMinutes(atMs: number): number {
  return atMs >= summerTimeAtMs ? 60 : 0;
}

export function dayOf(atMs: number): number {
  return Math.floor((atMs - startsAtMs) / dayMs);
}

/** What happens in the district: on these days a queue gets this many times its usual mail. */
const happenings: readonly { queue: QueueId; fromDay: number; toDay: number; times: number }[] = [
  { queue: 'leaks-and-bursts', fromDay: 9, toDay: 15, times: 3 }, // a hard frost
  { queue: 'sewer-flooding', fromDay: 33, toDay: 37, times: 5 }, // four days of rain
  { queue: 'water-quality', fromDay: 78, toDay: 81, times: 6 }, // a main is flushed and stirs up rust
  { queue: 'billing', fromDay: 7, toDay: 16, times: 1.6 }, // the bills go out
  { queue: 'billing', fromDay: 94, toDay: 104, times: 1.8 }, // and again, under the new tariff
  { queue: 'moving-home', fromDay: 24, toDay: 28, times: 1.5 },
  { queue: 'moving-home', fromDay: 82, toDay: 88, times: 1.5 },
];

export function crowdAt(queue: QueueId, day: number): number {
  return happenings
    .filter((each) => each.queue === queue && day >= each.fromDay && day <= each.toDay)
    .reduce((times, each) => times * each.times, 1);
}

/** Arrival times of `count` messages, ascending: fewer at weekends and at night. */
export function arrivals(count: number, chance: Chance): number[] {
  const days: Record<string, number> = {};
  for (let day = 0; day < scenarioDays; day += 1) {
    const isBusy = [9, 10, 11, 12, 13, 14, 15, 33, 34, 35, 36, 37, 78, 79, 80, 81].includes(day);
    days[day] = (day % 7 >= 5 ? 0.45 : 1) * (isBusy ? 1.35 : 1);
  }
  const hours: Record<string, number> = {};
  for (let hour = 0; hour < 24; hour += 1)
    hours[hour] = hour < 6 ? 0.15 : hour < 8 || hour > 21 ? 0.5 : hour > 17 ? 1 : 2;
  return Array.from({ length: count }, () => {
    const day = Number(chance.weighted(days));
    const hour = Number(chance.weighted(hours));
    return startsAtMs + day * dayMs + hour * 3600_000 + chance.below(3600) * 1000;
  }).sort((a, b) => a - b);
}
