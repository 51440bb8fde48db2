import { describe, expect, it } from 'vitest';
import { readDesk } from '../../src/desk/read-desk.ts';
import { decibansPerNat, weighEvidence } from '../../src/explain/balance.ts';
import { oddsInWords, signedDecibans } from '../../src/explain/odds-words.ts';
import { describeSlot } from '../../src/explain/slot-words.ts';
import { restOfWords, wordEvidence } from '../../src/explain/word-evidence.ts';
import { createExtractor } from '../../src/features/extractor.ts';
import { parseForm } from '../../src/message/form.ts';
import { parseMail } from '../../src/message/mail.ts';
import { defaultFit } from '../../src/model/fit.ts';
import { emptyCounts, epochAt, foldEntries } from '../../src/model/fold.ts';
import type { EvidencePart } from '../../src/model/posterior.ts';
import { explainParts, posteriorOf } from '../../src/model/posterior-of.ts';
import { createScorer } from '../../src/model/scorer.ts';
import { serve } from '../../src/model/served-table.ts';
import { deskJson } from '../scenario/desk.ts';
import { generateScenario, type ScenarioMessage } from '../scenario/scenario.ts';

const desk = readDesk(deskJson(), 'events/desk.json');
const extractor = createExtractor(desk, new Uint8Array(16).fill(7));
const queues = desk.queues.map((queue) => queue.id);

function messageOf({ bytes, contentType }: ScenarioMessage) {
  return contentType === 'application/json' ? parseForm(bytes) : parseMail(bytes);
}

async function learned(messages: readonly ScenarioMessage[]) {
  const entries = [];
  for (const each of messages) {
    const features = extractor.extract(await messageOf(each));
    entries.push({
      features,
      said: null,
      minus: null,
      plus: { queue: each.trueQueue, epoch: epochAt(each.arrivesAtMs) },
    });
  }
  const counts = foldEntries(emptyCounts(extractor.schema), entries);
  return createScorer(serve(counts, defaultFit(extractor.schema), { halfLifeDays: null }), [], queues, null);
}

describe('the balance of evidence', () => {
  it('adds up to the log odds of the two queues within 1e-9, whatever they are', async () => {
    const { messages } = generateScenario(3, { messages: 260 });
    const scorer = await learned(messages.slice(0, 220));
    for (const each of messages.slice(220)) {
      const message = await messageOf(each);
      const features = extractor.extract(message);
      const { logProb } = posteriorOf(scorer, features);
      const parts = explainParts(scorer, features);
      const words = extractor.words(message);
      for (const [a, b] of [
        [0, 1],
        [3, 5],
        [9, 2],
      ] as const) {
        const balance = weighEvidence(parts, queues, queues[a] as string, queues[b] as string, words);
        const odds = (logProb[a]! - logProb[b]!) * decibansPerNat;
        const items = balance.groups.flatMap((group) => group.items);
        expect(Math.abs(balance.decibans - odds)).toBeLessThan(1e-9);
        expect(Math.abs(items.reduce((sum, item) => sum + item.decibans, 0) - odds)).toBeLessThan(1e-9);
        expect(items.some((item) => item.label === restOfWords)).toBe(false);
      }
    }
  });

  it('shows negative evidence, strongest first, and turns its sign with the two queues', async () => {
    const { messages } = generateScenario(3, { messages: 260 });
    const scorer = await learned(messages.slice(0, 220));
    const message = await messageOf(messages[230] as ScenarioMessage);
    const parts = explainParts(scorer, extractor.extract(message));
    const words = extractor.words(message);
    const there = weighEvidence(parts, queues, 'billing', 'careers', words);
    const back = weighEvidence(parts, queues, 'careers', 'billing', words);
    expect(back.decibans).toBeCloseTo(-there.decibans, 9);
    const items = there.groups.find((group) => group.kind === 'word')?.items ?? [];
    const sizes = items.map((item) => Math.abs(item.decibans));
    expect(sizes).toEqual([...sizes].sort((x, y) => y - x));
    expect(items.some((item) => item.decibans < 0)).toBe(true);
  });
});

describe('evidence by word', () => {
  const part = (place: string, value: string, nats: number): EvidencePart => ({
    kind: 'token',
    place,
    value,
    score: Float64Array.of(nats, 0),
  });
  const first = (each: EvidencePart) => each.score[0] as number;

  it('gives a pair half to each word, a gram to the words that hold it, and keeps the sum', () => {
    const words = new Map([
      ['word:1', 'water'],
      ['word:2', 'meter'],
      ['pair:3', 'water meter'],
      ['pair:4', '^ water'],
      ['gram:5', 'ter '],
      ['gram:6', 'wate'],
    ]);
    const parts = [
      part('word', '1', 1),
      part('pair', '3', 4), // 2 each
      part('pair', '4', 0.5), // the beginning of the text is no word
      part('gram', '5', 3), // 1.5 each
      part('gram', '6', 0.25),
      part('word', '9', 8), // unknown
    ];
    const found = new Map(wordEvidence(parts, words, first).map((each) => [each.word, each.decibans]));
    expect(found).toEqual(
      new Map([
        ['water', 1 + 2 + 0.5 + 1.5 + 0.25],
        ['meter', 2 + 1.5],
        [restOfWords, 8],
      ]),
    );
  });
});

describe('words for people', () => {
  it.each([
    ['channel', 'form', 'came through a form'],
    ['recipient', 'other', 'written to an address that is not ours'],
    ['reference:account', 'absent', 'holds no reference of the kind “account”'],
    ['field:leak/where', 'road', 'chose “road” for “where”'],
    ['length', 'over-2500', 'over 2500 characters long'],
    ['something-new', 'x', 'something-new: x'],
  ])('describes %s = %s', (slot, value, text) => {
    expect(describeSlot(slot, value)).toBe(text);
  });

  it.each([
    [0, 'as likely as not'],
    [3.0103, '2 to 1'], // 10 log10 2
    [-10, '10 to 1'],
    [23, '200 to 1'], // 10^2.3 = 199.5
    [80, 'over a million to 1'],
  ])('says %s decibans as odds', (decibans, text) => {
    expect(oddsInWords(decibans)).toBe(text);
  });

  it('signs decibans with a true minus', () => {
    expect([signedDecibans(3.21), signedDecibans(-0.55), signedDecibans(-0.01)]).toEqual([
      '+3.2',
      '−0.6',
      '0.0',
    ]);
  });
});
