import { beforeAll, describe, expect, it } from 'vitest';
import { createReportHandler } from '../../src/handlers/report.ts';
import { recount } from '../../src/ledger/recount.ts';
import { collectReport } from '../../src/report/collect.ts';
import { openProposed } from '../../src/report/open-proposed.ts';
import type { ReportData } from '../../src/report/report-data.ts';
import { reportPage } from '../../src/report/report-page.ts';
import { writeReport } from '../../src/report/write-report.ts';
import { keys } from '../../src/store/keys.ts';
import { playSmallDesk, type SmallDesk } from '../settle/small-desk.ts';

const visits = [
  'Our class of 28 pupils would like to visit the treatment works on a school trip.',
  'Is there a guided tour of the treatment works for our pupils?',
  'I teach science and would like to bring pupils to the treatment works for a guided tour.',
  'Do you offer a guided tour or school trip to the treatment works in May?',
  'The school would like a guided tour; 30 pupils, a trip by coach to the treatment works.',
  'A school trip for pupils: is the treatment works open for a guided tour?',
  'Guided tour for our school, please: 25 pupils want to visit the treatment works.',
];

describe('the report of a store', () => {
  let desk: SmallDesk;
  let data: ReportData;
  /** The learned message that the router was surest of, and where it belongs. */
  let surest = { message: '', queue: '', posterior: 0 };
  const collect = async () => {
    const { extractor } = await desk.openBench();
    return collectReport(desk.world, await desk.deps.loadDesk(), extractor, {
      readMessage: desk.readMessage,
    });
  };

  beforeAll(async () => {
    desk = await playSmallDesk(260, 300);
    const nowMs = Date.UTC(2026, 4, 6);
    desk.setNow(nowMs);
    for (const [i, text] of visits.entries()) {
      const mail = `From: s${i}@school.example\r\nTo: contact@fenmarkwater.example\r\nSubject: School trip\r\n\r\n${text}\r\n`;
      await desk.store.put(`${keys.inbound}mail/visit-${i}`, Buffer.from(mail), {
        contentType: 'message/rfc822',
        metadata: {
          'tallypost-decision': 'held',
          'tallypost-reason': 'unsure',
          'tallypost-at': new Date(nowMs - i).toISOString(),
        },
      });
    }
    for (const { key, trueQueue } of desk.messages.slice(130, 260)) {
      const posterior = Number((await desk.store.head(key))?.metadata['tallypost-posterior']);
      const message = key.slice(keys.inbound.length);
      if (posterior > surest.posterior && trueQueue !== 'billing')
        surest = { message, queue: trueQueue, posterior };
    }
    const drop = { message: surest.message, queue: 'billing', by: 'slip', at: new Date(nowMs).toISOString() };
    await desk.store.put(`${keys.confirmations}slip.json`, Buffer.from(JSON.stringify(drop)));
    await desk.runner.run({ segmentsMax: Number.POSITIVE_INFINITY });
    data = await collect();
  }, 240_000);

  it('counts what was routed, held, confirmed and waits, as the store has it', () => {
    expect(data.looked).toMatchObject({ messages: 307, isAll: true, confirmed: 260 });
    expect(data.volume.steps.reduce((sum, each) => sum + each.routed + each.guarded + each.held, 0)).toBe(
      307,
    );
    expect(data.waiting.messages).toBeGreaterThanOrEqual(visits.length);
    expect(data.corrections.revised).toBe(1);
    // Every message that was routed or held with a queue named and confirmed since stands in the record, once.
    expect(data.promises.bands.reduce((sum, band) => sum + band.cameTrue.of, 0)).toBe(data.routing.judged);
  });

  it('finds the confirmation that everything else contradicts', () => {
    const found = data.secondLook.find((each) => each.message === surest.message);
    expect(found).toMatchObject({ confirmed: 'billing', by: 'slip', likelier: surest.queue });
    expect(found!.confirmedProbability).toBeLessThan(0.01);
  });

  it('says that the table is sound, and counted again', () => {
    expect(data.health.faults).toEqual([]);
    expect(data.health.recount).toEqual({ messages: 260, differences: 0 });
    expect(data.health.messages).toBe(260);
    expect(data.health.weights.length).toBeGreaterThan(5);
  });

  it('proposes a queue for the held messages that share words of their own', () => {
    const group = data.newQueues.find((each) => each.messages.includes('mail/visit-0'));
    expect(
      visits.filter((_, i) => group?.messages.includes(`mail/visit-${i}`)).length,
    ).toBeGreaterThanOrEqual(6);
    expect(group!.words.slice(0, 6)).toEqual(expect.arrayContaining(['pupils', 'tour']));
  });

  it('writes page and numbers under the day and as the latest, with nothing of any message but words', async () => {
    const { extractor } = await desk.openBench();
    const written = await writeReport(desk.world, await desk.deps.loadDesk(), extractor, {
      readMessage: desk.readMessage,
    });
    expect([written.page, written.numbers]).toEqual(['reports/2026-05-06.html', 'reports/2026-05-06.json']);
    for (const key of ['reports/latest.html', 'reports/2026-05-06.html']) {
      const got = await desk.store.get(key);
      expect(got.kind === 'found' && Buffer.from(got.object.body).toString()).toBe(reportPage(written.data));
    }
    const page = reportPage(written.data);
    for (const text of visits) expect(page).not.toContain(text);
    expect(page).not.toContain('@school.example');
  });

  it('is written by the function that a schedule starts, which logs where and nothing of any message', async () => {
    const from = desk.logged.length;
    const result = await createReportHandler(desk.deps)({ 'detail-type': 'Scheduled Event' });
    expect(result.page).toBe('reports/2026-05-06.html');
    expect(desk.logged.slice(from)).toEqual([{ level: 'info', event: 'report', tookMs: 0, ...result }]);
    const broken = createReportHandler({
      ...desk.deps,
      loadDesk: () => Promise.reject(new Error('no desk')),
    });
    await expect(broken({})).rejects.toThrow('no desk');
    expect(desk.logged.at(-1)).toMatchObject({ level: 'error', event: 'report-failed' });
  });

  it('opens the proposed queue and confirms its messages, once, as a helpdesk would', async () => {
    const { extractor } = await desk.openBench();
    const group = data.newQueues.findIndex((each) => each.messages.includes('mail/visit-0')) + 1;
    const open = async (dryRun: boolean) =>
      openProposed(desk.world, await desk.deps.loadDesk(), extractor.schema, {
        group,
        queue: 'visits',
        title: 'Visits',
        by: 'lead',
        dryRun,
      });
    const size = data.newQueues[group - 1]!.messages.length;
    expect((await open(true)).confirmed).toHaveLength(size);
    const opened = await open(false);
    expect([opened.opened.kind, opened.confirmed.length, opened.left.length]).toEqual(['changed', size, 0]);
    const summary = await desk.runner.run({ segmentsMax: Number.POSITIVE_INFINITY });
    expect([summary.confirmed, summary.refused, summary.failed]).toEqual([size, 0, 0]);
    const again = await open(false);
    expect([again.confirmed.length, again.left.length]).toEqual([0, size]);
    const counted = await recount(desk.world, await desk.deps.loadDesk(), extractor.schema);
    expect([counted.messages, counted.differences]).toEqual([260 + size, []]);
    const next = await collect();
    expect(next.newQueues.some((each) => each.messages.includes('mail/visit-0'))).toBe(false);
    await expect(
      openProposed(desk.world, await desk.deps.loadDesk(), extractor.schema, {
        group: 99,
        queue: 'x',
        title: 'X',
        by: 'lead',
      }),
    ).rejects.toMatchObject({ code: 'proposal-missing', place: 'reports/latest.json' });
  });
});
