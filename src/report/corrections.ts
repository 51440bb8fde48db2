import type { Correction, Corrections } from './report-data.ts';
import { judged, type Seen } from './seen.ts';

/** From which queue to which people moved messages; most frequent first, routed ones before held ones. */
export function countCorrections(seen: readonly Seen[]): Corrections {
  const pairs = new Map<string, { from: string; to: string; routed: number; held: number }>();
  for (const { queue, confirmed, kind } of judged(seen)) {
    if (queue === confirmed.queue) continue;
    const key = `${queue} ${confirmed.queue}`;
    const pair = pairs.get(key) ?? { from: queue, to: confirmed.queue, routed: 0, held: 0 };
    pair[kind === 'routed' ? 'routed' : 'held'] += 1;
    pairs.set(key, pair);
  }
  const sorted: Correction[] = [...pairs.values()].sort(
    (a, b) =>
      b.routed + b.held - a.routed - a.held ||
      b.routed - a.routed ||
      (a.from + a.to < b.from + b.to ? -1 : 1),
  );
  return {
    pairs: sorted,
    routedWrong: sorted.reduce((sum, pair) => sum + pair.routed, 0),
    heldWrong: sorted.reduce((sum, pair) => sum + pair.held, 0),
    revised: seen.filter((each) => each.isRevised).length,
  };
}
