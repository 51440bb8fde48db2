import type { Volume, VolumeStep } from './report-data.ts';
import type { Seen } from './seen.ts';

const dayMs = 24 * 3600 * 1000;
/** A longer time is shown by week: more columns than this cannot be told apart on a telephone. */
const daysMax = 35;
const stepsMax = 27;

/** Messages by day or by week (from Monday, UTC), by what became of them. At most the last half year. */
export function countVolume(seen: readonly Seen[]): Volume {
  if (seen.length === 0) return { step: 'day', steps: [] };
  const times = seen.map((each) => each.atMs);
  const [first, last] = [Math.min(...spread(times)), Math.max(...spread(times))];
  const step = last - first > daysMax * dayMs ? 'week' : 'day';
  const lengthMs = step === 'week' ? 7 * dayMs : dayMs;
  // 1970-01-01 was a Thursday; four days later a week begins.
  const originMs = step === 'week' ? 4 * dayMs : 0;
  const indexOf = (ms: number) => Math.floor((ms - originMs) / lengthMs);
  const from = Math.max(indexOf(first), indexOf(last) - stepsMax + 1);
  const steps = Array.from({ length: indexOf(last) - from + 1 }, (_, i) => ({
    from: new Date(originMs + (from + i) * lengthMs).toISOString(),
    routed: 0,
    guarded: 0,
    held: 0,
  }));
  for (const each of seen) {
    const found = steps[indexOf(each.atMs) - from];
    if (found) found[each.kind] += 1;
  }
  return { step, steps: steps satisfies VolumeStep[] };
}

/** Math.min of many arguments overflows the stack; the bound of the messages looked at keeps below that. */
function spread(times: readonly number[]): readonly number[] {
  return times.length < 50_000
    ? times
    : [times.reduce((a, b) => Math.min(a, b)), times.reduce((a, b) => Math.max(a, b))];
}
