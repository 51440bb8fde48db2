import { expect, test } from 'vitest';
import { posteriorOf } from '../../src/model/posterior-of.ts';
import { learnRows } from './slots.ts';

/** So small a prior that it changes nothing at 1e-9. */
const vanishing = 1e-12;

test('Manning, Raghavan, Schütze, Introduction to Information Retrieval, example 13.2: Bernoulli, add one', () => {
  const words = ['Chinese', 'Beijing', 'Shanghai', 'Macao', 'Tokyo', 'Japan'];
  const row = (text: string, label: string) => [
    ...words.map((w) => (text.split(' ').includes(w) ? 'in' : 'out')),
    label,
  ];
  const { scorer, featuresOf } = learnRows(
    Object.fromEntries(words.map((w) => [w, ['out', 'in']])),
    [
      row('Chinese Beijing Chinese', 'China'),
      row('Chinese Chinese Shanghai', 'China'),
      row('Chinese Macao', 'China'),
      row('Tokyo Japan Chinese', 'not China'),
    ],
    { alpha: vanishing, beta: 1 },
  );
  const { queues, probability } = posteriorOf(
    scorer,
    featuresOf(row('Chinese Chinese Chinese Tokyo Japan', '')),
  );
  // The book: P(c|d5) ∝ 3/4 · 4/5 · 1/5 · 1/5 · (1 - 2/5)³ = 0.005184 ≈ 0.005,
  // P(not c|d5) ∝ 1/4 · 2/3 · 2/3 · 2/3 · (1 - 1/3)³ = 64/2916 ≈ 0.022: the document is not about China.
  expect(queues).toEqual(['China', 'not China']);
  expect(Math.abs(probability[0] - 0.005184 / (0.005184 + 64 / 2916))).toBeLessThan(1e-9);
  expect(probability[1]).toBeGreaterThan(probability[0]);
});

test('Mitchell, Machine Learning, table 3.2 and section 6.9.1, as the limit of vanishing priors', () => {
  const days = `
    Sunny Hot High Weak No
    Sunny Hot High Strong No
    Overcast Hot High Weak Yes
    Rain Mild High Weak Yes
    Rain Cool Normal Weak Yes
    Rain Cool Normal Strong No
    Overcast Cool Normal Strong Yes
    Sunny Mild High Weak No
    Sunny Cool Normal Weak Yes
    Rain Mild Normal Weak Yes
    Sunny Mild Normal Strong Yes
    Overcast Mild High Strong Yes
    Overcast Hot Normal Weak Yes
    Rain Mild High Strong No`;
  const { scorer, featuresOf } = learnRows(
    {
      outlook: ['Sunny', 'Overcast', 'Rain'],
      temperature: ['Hot', 'Mild', 'Cool'],
      humidity: ['High', 'Normal'],
      wind: ['Weak', 'Strong'],
    },
    days
      .trim()
      .split('\n')
      .map((line) => line.trim().split(' ')),
    { alpha: vanishing, beta: vanishing },
  );
  const { queues, probability } = posteriorOf(scorer, featuresOf(['Sunny', 'Cool', 'High', 'Strong']));
  expect(queues).toEqual(['No', 'Yes']);
  // P(yes)·P(sunny|yes)·P(cool|yes)·P(high|yes)·P(strong|yes) = 9/14 · 2/9 · 3/9 · 3/9 · 3/9 = 1/189 ≈ 0.0053
  // P(no)·… = 5/14 · 3/5 · 1/5 · 4/5 · 3/5 = 18/875 ≈ 0.0206; the book: 0.0206/(0.0206 + 0.0053) = 0.795
  const no = 18 / 875;
  const yes = 1 / 189;
  expect(Math.abs(probability[0] - no / (no + yes))).toBeLessThan(1e-9);
  expect(probability[0]).toBeCloseTo(0.795, 3);
  expect(probability[1]).toBeCloseTo(0.205, 3);
});
