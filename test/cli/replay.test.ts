import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { deskFile, labelled, lay, mail, runCli } from './run-cli.ts';

let root: string;
const path = (name: string) => join(root, name);
const line = (value: unknown) => `${JSON.stringify(value)}\n`;

beforeAll(async () => {
  root = await mkdtemp(join(tmpdir(), 'tallypost-replay-'));
  const learn = labelled(90);
  const score = labelled(120).slice(90);
  const dated = learn.map(({ queue, text }, i) =>
    line({ queue, mail: mail('Request', text), at: new Date(Date.UTC(2026, 2, 1, i)).toISOString() }),
  );
  await lay(root, {
    'learn.csv': `text,queue\n${learn.map(({ queue, text }) => `"${text}",${queue}\n`).join('')}`,
    'score.csv': `text,queue\n${score.map(({ queue, text }) => `"${text}",${queue}\n`).join('')}`,
    'strange.csv': `text,queue\n"${score[0].text}",${score[0].queue}\n"who knows",unheard-of\n`,
    'dated.jsonl.gz': gzipSync(dated.join('')),
    // The same messages, those of one queue after those of another.
    'sorted.jsonl': [...learn]
      .sort((a, b) => (a.queue < b.queue ? -1 : a.queue > b.queue ? 1 : 0))
      .map(({ queue, text }) => line({ queue, form: { id: 'f', fields: { text } } }))
      .join(''),
    'faulty.jsonl': `{"queue":"billing"}\nnot json\n${learn.map(({ queue, text }) => line({ queue, mail: mail('x', text) })).join('')}`,
    'box/billing.mbox': `From a Mon Mar  2 10:00:00 2026\n\nmy bill is wrong\n\nFrom b Mon Mar  2 11:00:00 2026\n\nthe bill again\n\n`,
    'box/leaks/1.eml': mail('Leak', 'a leak in the road'),
    'box/leaks/2.eml': mail('Leak', 'water from a leak'),
    'desk.json': deskFile,
  });
});
afterAll(() => rm(root, { recursive: true, force: true }));

const replay = async (...args: string[]) => {
  const ran = await runCli('replay', ...args, '--json');
  expect(ran.err).toBe('');
  expect(ran.code).toBe(0);
  return ran.json();
};

describe('replay', () => {
  it('learns one history and scores another, with every number that it promises', async () => {
    const result = await replay('--learn', path('learn.csv'), '--score', path('score.csv'));
    expect(result).toMatchObject({ messages: 30, queues: 3, learned: 90, scored: 30, unknownQueue: 0 });
    // The sentences repeat: nothing is left to chance but the number behind them.
    expect(result.accuracy).toBe(1);
    expect(result.routedAt95).toBe(1);
    expect(result.logLoss).toBeGreaterThan(0);
    expect(result.logLoss).toBeLessThan(0.3);
    for (const name of ['calibrationError', 'heldShare']) {
      expect(result[name]).toBeGreaterThanOrEqual(0);
      expect(result[name]).toBeLessThanOrEqual(1);
    }
    for (const name of ['tableBytes', 'cells', 'messagesPerSecond', 'peakRssBytes'])
      expect(result[name]).toBeGreaterThan(0);
    expect(result.curve.at(-1)).toMatchObject({ routedShare: 1, precision: 1 });
    expect(result.fit.blocks.length).toBeGreaterThan(5);
    const { routed, held, guarded } = result.decisions;
    expect(routed + held + guarded).toBe(30);
    // 30 looks of 2 minutes against the held ones alone, since all routed ones are right.
    expect(result.staffMinutes).toMatchObject({
      lookAtEach: 60,
      withRouting: 2 * held,
      saved: 60 - 2 * held,
    });
  });

  it('is the same each time', async () => {
    const args = ['--learn', path('learn.csv'), '--score', path('score.csv')];
    const [a, b] = [await replay(...args), await replay(...args)];
    for (const name of ['logLoss', 'calibrationError', 'tableBytes', 'curve', 'fit'])
      expect(a[name]).toEqual(b[name]);
  });

  it('counts a queue that was never learned as an error, honestly', async () => {
    const result = await replay('--learn', path('learn.csv'), '--score', path('strange.csv'));
    expect(result).toMatchObject({ messages: 2, queues: 3, unknownQueue: 1, accuracy: 0.5 });
    // The one that could not be right weighs -ln 1e-15 = 34.54 nats.
    expect(result.logLoss).toBeGreaterThan(34.5 / 2);
    expect(result.confusions).toContainEqual(expect.objectContaining({ truth: null, messages: 1 }));
  });

  it('leaves the last part in time out when nothing else is given', async () => {
    const result = await replay('--learn', path('dated.jsonl.gz'));
    // 30 % of 90.
    expect(result).toMatchObject({ learned: 63, scored: 27 });
    expect(result.note).toContain('the last 30 % in time');
  });

  it('leaves the last part of each queue out when the messages bear no time', async () => {
    const result = await replay('--learn', path('sorted.jsonl'));
    // 30 of each of three queues; 21 of each are learned.
    expect(result).toMatchObject({ learned: 63, scored: 27, unknownQueue: 0, accuracy: 1 });
    expect(result.note).toContain('of each queue');
  });

  it('predicts each message, then folds it', async () => {
    const result = await replay('--learn', path('dated.jsonl.gz'), '--progressive');
    expect(result).toMatchObject({ learned: 90, scored: 90 });
    // The first message of all can only be guessed, and is held.
    expect(result.decisions.heldBy['nothing-learned']).toBe(1);
    expect(result.accuracy).toBeGreaterThan(0.6);
    expect(result.accuracy).toBeLessThan(1);
    expect(result.note).toContain('in the order of time');
  });

  it('interleaves the queues of a progressive history without times', async () => {
    const result = await replay('--learn', path('sorted.jsonl'), '--progressive');
    expect(result.note).toContain('interleaved');
    // Queue after queue each would be met after the others only: then two of three were never right at first.
    expect(result.accuracy).toBeGreaterThan(0.6);
  });

  it('reads what it can and lists the rest with file and line', async () => {
    const result = await replay('--learn', path('faulty.jsonl'));
    expect(result.histories[0]).toMatchObject({ messages: 90, unusable: 2 });
    expect(
      result.histories[0].faults.map(({ code, place }: { code: string; place: string }) => [code, place]),
    ).toEqual([
      ['content-missing', path('faulty.jsonl:1')],
      ['json-unreadable', path('faulty.jsonl:2')],
    ]);
  });

  it('reads folders of mail and of mbox files together', async () => {
    const result = await replay('--learn', path('box'), '--score', path('box'));
    expect(result).toMatchObject({ learned: 4, scored: 4, queues: 2 });
  });

  it('routes by a given desk: its queues, guards and costs', async () => {
    const result = await replay(
      '--learn',
      path('learn.csv'),
      '--score',
      path('score.csv'),
      '--desk',
      path('desk.json'),
    );
    expect(result).toMatchObject({ queues: 3, unknownQueue: 0 });
  });

  it('tells people the same in words', async () => {
    const { code, out } = await runCli('replay', '--learn', path('faulty.jsonl'));
    expect(code).toBe(0);
    expect(out).toContain('likeliest queue right');
    expect(out).toContain('2 lines or files of');
    expect(out).toContain(`${path('faulty.jsonl:2')}: json-unreadable`);
  });
});
