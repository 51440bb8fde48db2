import { beforeAll, describe, expect, test } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { type Report, runInChild } from './child.ts';
import { hostileInputs } from './hostile-inputs.ts';
import type { RouteResult } from './run-routes.ts';

let report: Report<RouteResult>;

/** All inputs go through the route function of a desk that has learned and has a guard, in one process of their own. */
beforeAll(async () => {
  report = await runInChild<RouteResult>('./run-routes.ts');
  const all = [...report.results.values()];
  const slowest = all.reduce((a, b) => (b.cpuMs > a.cpuMs ? b : a));
  const counts = new Map<string, number>();
  for (const { decision } of all) {
    const kind = decision.replace(/^(routed|held) (?:billing|leaks|moving) ?/, '$1 ').trim();
    counts.set(kind, (counts.get(kind) ?? 0) + 1);
  }
  console.log(
    `hostile inputs routed: ${JSON.stringify(Object.fromEntries(counts))}; slowest ${slowest.cpuMs.toFixed(0)} ms of CPU (${slowest.name}); peak memory ${Math.max(...all.map(({ peakMb }) => peakMb)).toFixed(0)} MB`,
  );
}, 600_000);

describe('the decision on a hostile input', () => {
  test('is made by a desk that knows the plea and guards against the padding', () => {
    expect(report.stuckAt).toBeNull();
    expect(report.results.get('the plea alone')?.decision).toBe('routed billing');
    expect(report.results.get('the plea with padding that is seen')?.decision).toBe('guarded leaks flood');
  });

  test.each(hostileInputs.map(({ name, expectedDecision }) => [name, expectedDecision]))('%s: %s', (name) => {
    expect(report.results.get(name)?.faults).toEqual([]);
  });

  test.each([
    ['white on white', /^routed billing$/],
    ['spam by the verdict of the receiving service', /^held \w+ suspect$/],
    ['encrypted mail (S/MIME)', /^held \w+ unreadable$/],
    ['an automatic reply to an automatic reply of the desk', /^held \w+ automatic$/],
    ['25,000 words that nobody ever used', /^held \w+ unlike-anything-seen$/],
  ])('%s: as written, %s', (name, decision) => {
    expect(report.results.get(name)?.decision).toMatch(decision);
  });

  test('takes no longer than the deadline on parsing and one piece of work more', () => {
    expect([...report.results.values()].filter(({ cpuMs }) => cpuMs > 3 * bounds.parseMsMax)).toEqual([]);
  });

  test('takes less than 256 MB, all of them one after the other', () => {
    expect(Math.max(...[...report.results.values()].map(({ peakMb }) => peakMb))).toBeLessThan(256);
  });
});
