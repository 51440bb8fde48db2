import { expect, test } from 'vitest';
import { posteriorOf } from '../../src/model/posterior-of.ts';
import { learnRows } from './slots.ts';
import votes from './votes.json' with { type: 'json' };

test(`congressional votes score as by ${votes.source}`, () => {
  const party = new Map(votes.parties.map((name) => [name[0], name]));
  const rows = votes.votes.map((vote, i) => [...vote, party.get(votes.party[i]) as string]);
  const columns = Object.fromEntries([...votes.votes[0]].map((_, j) => [`vote ${j + 1}`, ['?', 'n', 'y']]));
  // Its class prior is the plain share of the classes, the limit of a vanishing α.
  const { scorer, featuresOf } = learnRows(columns, rows.slice(0, votes.learned), { alpha: 1e-12, beta: 1 });
  expect(scorer.queues).toEqual(votes.parties);
  expect(votes.logProb).toHaveLength(135);
  votes.logProb.forEach((expected, i) => {
    const { logProb } = posteriorOf(scorer, featuresOf(rows[votes.learned + i]));
    for (let k = 0; k < 2; k++) expect(Math.abs(logProb[k] - expected[k])).toBeLessThan(1e-9);
  });
});
