import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import * as answers from '../../src/report/answers.ts';
import { estimate } from '../../src/report/estimate.ts';
import type { ReportData } from '../../src/report/report-data.ts';
import { reportPage } from '../../src/report/report-page.ts';
import { ago, inHundred, listed, minutes, percent } from '../../src/report/words-for-numbers.ts';
import { sampleReport } from './sample-data.ts';

const empty: ReportData = {
  ...sampleReport,
  looked: { messages: 0, isAll: true, from: null, to: null, confirmed: 0 },
  waiting: { messages: 0, oldestAt: null },
  promises: { bands: [], audit: estimate(0, 0) },
  routing: {
    judged: 0,
    curve: [],
    today: { share: 0, right: estimate(0, 0) },
    cheapest: null,
    minutesPer1000: null,
  },
  corrections: { pairs: [], routedWrong: 0, heldWrong: 0, revised: 0 },
  volume: { step: 'day', steps: [] },
  drift: [],
  secondLook: [],
  newQueues: [],
  health: {
    ...sampleReport.health,
    recount: null,
    messages: 0,
    compactedAt: null,
    fit: { messages: 0, logLoss: null },
  },
};

describe('the report page', () => {
  it('needs nothing from anywhere: no script, no link out, a policy that allows its own style only', () => {
    const page = reportPage(sampleReport);
    expect(page).not.toMatch(/<script|<link|<img|<iframe|<object|@import|url\((?!#)|\ssrc=|https?:/);
    expect(page).not.toMatch(/\sstyle=/);
    expect(page).not.toMatch(/\son[a-z]+=/);
    expect(page).toMatch(
      /content="default-src &#39;none&#39;; style-src &#39;sha256-[A-Za-z0-9+/]{43}=&#39;; base-uri &#39;none&#39;; form-action &#39;self&#39;"/,
    );
  });

  it('is the same for the same numbers, is small, and holds every view', () => {
    const page = reportPage(sampleReport);
    expect(reportPage(JSON.parse(JSON.stringify(sampleReport)))).toBe(page);
    expect(page.length).toBeLessThan(100_000);
    const ids = [
      'promises',
      'routing',
      'corrections',
      'volume',
      'drift',
      'second-look',
      'new-queue',
      'health',
    ];
    for (const id of ids) expect(page).toContain(`<h2 id="${id}">`);
    expect(page).not.toMatch(/NaN|undefined|Infinity|\[object/);
  });

  it('says so where there is nothing to show', () => {
    const page = reportPage(empty);
    expect(page).not.toMatch(/NaN|undefined|Infinity|\[object/);
    expect(page).toContain('nobody can say how far to trust it');
    expect(page).toContain('Nothing has come in yet.');
  });

  it('shows words and ids of messages as text', () => {
    const page = reportPage({
      ...sampleReport,
      desk: '<b>Desk</b>',
      drift: [{ ...sampleReport.drift[0]!, words: ['<script>x</script>', '\u202eevil'] }],
      secondLook: [{ ...sampleReport.secondLook[0]!, message: '"><script>', by: "o'<i>" }],
    });
    expect(page).not.toMatch(/<script|<b>|<i>|\u202e/);
    expect(page).toContain('&lt;script&gt;x&lt;/script&gt;');
  });

  it('stays under 300 KB whatever the store holds: every list in it is bounded', () => {
    // A thousand queues, a million messages: what collectReport gives at most (src/bounds.ts), with long ids and words.
    const id = (i: number) => `mail/${'x'.repeat(80)}-${i}`;
    const queues = Array.from({ length: 1000 }, (_, i) => ({
      id: `q${i}`,
      title: `Queue ${'long '.repeat(20)}${i}`,
    }));
    const page = reportPage({
      ...sampleReport,
      queues,
      corrections: {
        pairs: queues.map((queue) => ({ from: queue.id, to: 'q0', routed: 1, held: 1 })),
        routedWrong: 1000,
        heldWrong: 1000,
        revised: 1_000_000,
      },
      drift: queues.map((queue) => ({
        ...sampleReport.drift[0]!,
        queue: queue.id,
        words: Array(8).fill('w'.repeat(40)),
      })),
      secondLook: Array.from({ length: bounds.secondLookListedMax }, (_, i) => ({
        ...sampleReport.secondLook[0]!,
        message: id(i),
      })),
      newQueues: Array.from({ length: bounds.newQueuesListedMax }, () => ({
        decibans: 500,
        words: Array(10).fill('w'.repeat(40)),
        messages: Array.from({ length: bounds.groupedMessagesMax }, (_, i) => id(i)),
      })),
    });
    expect(page.length).toBeLessThan(300_000);
    expect(page).toContain('988 further pairs');
  });
});

describe('its sentences', () => {
  it('answer how far to trust it, with chance allowed for', () => {
    // 1726/1778 = 97.1 %; Wilson 95 %: 0.9618 to 0.9776.
    expect(answers.trustAnswer(sampleReport)).toBe(
      'Of 1,778 messages that it routed by itself and that people confirmed since, 97 in 100 were right (between 96\u00a0% and 98\u00a0%, allowing for chance).',
    );
  });

  it('name the broken promise and say that the others were kept', () => {
    expect(answers.promisesAnswer(sampleReport)).toBe(
      'It was too sure of itself where it said 82 to 91\u00a0%: fewer came true than it said. Elsewhere its probabilities came true.',
    );
  });

  it('weigh staff time under the desk’s costs', () => {
    // 2000 minutes = 33.3 hours, 830 = 13.8 hours, saved 1170 = 19.5 hours.
    expect(answers.routingAnswer(sampleReport)).toBe(
      'Today’s rule routes 78 in 100 by itself. A thousand messages cost 14 hours of staff time instead of 33 hours for looking at each (2 minutes a look): 20 hours saved.',
    );
    expect(answers.cheapestAnswer(sampleReport)).toMatch(/^No single limit/); // 40 of 2,000 minutes
  });

  it('put what presses most first, at most four', () => {
    const anchors = (data: ReportData) => answers.tasksOf(data).map((task) => task.anchor);
    expect(anchors(sampleReport)).toEqual(['volume', 'new-queue', 'second-look', 'promises']);
    const broken = {
      ...sampleReport,
      health: { ...sampleReport.health, faults: ['counts-identity at model/tables/x'] },
    };
    expect(anchors(broken)[0]).toBe('health');
    expect(answers.healthAnswer(broken)).toBe('The table is not sound: counts-identity at model/tables/x.');
    expect(anchors({ ...empty, looked: { ...empty.looked, confirmed: 500 } })).toEqual([]);
  });

  it.each([
    [inHundred(0.996), '99.6 in 100'],
    [inHundred(1), '100 in 100'],
    [inHundred(0.004), '0.4 in 100'],
    [percent(0.934), '93\u00a0%'],
    [minutes(830), '14 hours'],
    [minutes(0.4), 'under a minute'],
    [listed(['a', 'b', 'c']), 'a, b and c'],
    [ago('2026-05-01T00:00:00Z', '2026-05-02T23:00:00Z'), '47 hours'],
    [ago('2026-05-01T00:00:00Z', '2026-05-04T00:00:00Z'), '3 days'],
  ])('write numbers as people read them: %s', (got, wanted) => {
    expect(got).toBe(wanted);
  });
});
