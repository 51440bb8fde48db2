import { estimate } from '../../src/report/estimate.ts';
import type { ReportData } from '../../src/report/report-data.ts';

// biome-ignore format: one table
const weeks = [
  [40, 2, 96], [71, 3, 64], [88, 2, 49], [97, 4, 41], [101, 3, 34], [132, 5, 40], [110, 2, 31], [118, 3, 27], [121, 2, 25],
  [130, 4, 24], [117, 3, 22], [148, 6, 44], [126, 2, 30], [131, 3, 26], [138, 2, 25], [129, 3, 38], [92, 1, 33],
];

/** Invented numbers with something in every view. */
export const sampleReport: ReportData = {
  format: 1,
  desk: 'Fenmark Water',
  madeAt: '2026-05-04T02:10:00.000Z',
  modelVersion: 412,
  queues: [
    { id: 'billing', title: 'Billing and payments' },
    { id: 'meter-readings', title: 'Meters and readings' },
    { id: 'moving-home', title: 'Moving home' },
    { id: 'complaints', title: 'Complaints' },
  ],
  costs: { lookMinutes: 2, wrongRouteMinutes: 15 },
  looked: {
    messages: 2588,
    isAll: true,
    from: '2026-01-05T06:10:00.000Z',
    to: '2026-05-04T01:00:00.000Z',
    confirmed: 2512,
  },
  waiting: { messages: 37, oldestAt: '2026-04-27T09:00:00.000Z' },
  promises: {
    bands: [
      { from: 0, to: 0.321, cameTrue: estimate(22, 96), verdict: 'kept' },
      { from: 0.321, to: 0.5, cameTrue: estimate(48, 112), verdict: 'kept' },
      { from: 0.5, to: 0.679, cameTrue: estimate(84, 141), verdict: 'kept' },
      { from: 0.679, to: 0.818, cameTrue: estimate(121, 168), verdict: 'kept' },
      { from: 0.818, to: 0.905, cameTrue: estimate(150, 194), verdict: 'too-high' },
      { from: 0.905, to: 0.953, cameTrue: estimate(231, 248), verdict: 'kept' },
      { from: 0.953, to: 0.989, cameTrue: estimate(522, 540), verdict: 'kept' },
      { from: 0.989, to: 1, cameTrue: estimate(815, 819), verdict: 'kept' },
    ],
    audit: estimate(33, 34),
  },
  routing: {
    judged: 2280,
    curve: Array.from({ length: 100 }, (_, i) => ({
      share: (i + 1) / 100,
      right: 1 - 0.0018 * ((i + 1) / 20) ** 2.1,
      probability: 1 - 0.55 * ((i + 1) / 100) ** 4,
    })),
    today: { share: 0.78, right: estimate(1726, 1778) },
    cheapest: { share: 0.83, right: 0.964, probability: 0.86 },
    minutesPer1000: { lookAtEach: 2000, today: 830, cheapest: 790 },
  },
  corrections: {
    pairs: [
      { from: 'billing', to: 'complaints', routed: 14, held: 31 },
      { from: 'meter-readings', to: 'billing', routed: 12, held: 22 },
      { from: 'moving-home', to: 'billing', routed: 8, held: 19 },
      { from: 'billing', to: 'meter-readings', routed: 0, held: 9 },
    ],
    routedWrong: 34,
    heldWrong: 81,
    revised: 68,
  },
  volume: {
    step: 'week',
    steps: weeks.map(([routed, guarded, held], i) => ({
      from: new Date(Date.UTC(2026, 0, 5) + i * 7 * 24 * 3_600_000).toISOString(),
      routed: routed as number,
      guarded: guarded as number,
      held: held as number,
    })),
  },
  drift: [
    {
      queue: 'meter-readings',
      decibans: 64,
      recentMessages: 41,
      earlierMessages: 320,
      since: '2026-04-20T01:00:00.000Z',
      words: ['heron', 'green', 'card', 'swap', 'dial'],
    },
    {
      queue: 'moving-home',
      decibans: 14,
      recentMessages: 30,
      earlierMessages: 300,
      since: '2026-04-20T01:00:00.000Z',
      words: [],
    },
  ],
  secondLook: [
    {
      message: 'mail/20260411T101500-5dc875cd',
      confirmed: 'moving-home',
      by: 'm.quill',
      at: '2026-04-11T13:00:00.000Z',
      likelier: 'billing',
      likelierProbability: 0.994,
      confirmedProbability: 0.002,
    },
    {
      message: 'forms/20260420T081500-0c11d2aa.json',
      confirmed: 'complaints',
      by: 'a.tolland',
      at: '2026-04-20T09:00:00.000Z',
      likelier: 'meter-readings',
      likelierProbability: 0.95,
      confirmedProbability: 0.008,
    },
  ],
  newQueues: [
    {
      messages: Array.from(
        { length: 19 },
        (_, i) => `mail/202604${String(12 + i).padStart(2, '0')}T090000-aa00bb${10 + i}`,
      ),
      decibans: 212,
      words: ['school', 'tour', 'pupils', 'visit', 'guided', 'coach'],
    },
  ],
  health: {
    faults: [],
    recount: { messages: 2332, differences: 0 },
    messages: 2332,
    cells: 96_104,
    tableBytes: 412_332,
    segments: 0,
    compactedAt: '2026-05-04T02:00:00.000Z',
    fit: { messages: 2000, logLoss: 0.31 },
    weights: [
      { what: 'how much mail each queue gets', exponent: 0.94 },
      { what: 'which form was used', exponent: 0.71 },
      { what: 'single words', exponent: 0.62 },
      { what: 'pairs of neighbouring words', exponent: 0.38 },
      { what: 'the address written to', exponent: 0.33 },
      { what: 'weekday and hour', exponent: 0.02 },
    ],
  },
};
