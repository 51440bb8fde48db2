import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { simpleParser } from 'mailparser';
import { describe, expect, it } from 'vitest';
import { readDesk } from '../../src/desk/read-desk.ts';
import { deskJson } from './desk.ts';
import { addTypos, writeSentence } from './grammar.ts';
import { labelledLines } from './labelled.ts';
import { eventFiles, formEncodedKey } from './lambda-events.ts';
import { headerText, textPart } from './mime.ts';
import { createChance } from './random.ts';
import { samples } from './samples.ts';
import { generateScenario, type ScenarioMessage } from './scenario.ts';
import { queueIds } from './topic.ts';

const scenario = generateScenario(1);
const { messages } = scenario;
const textOf = (message: ScenarioMessage) => Buffer.from(message.bytes).toString('utf8');
const shareOf = (isIt: (message: ScenarioMessage) => boolean) =>
  messages.filter(isIt).length / messages.length;

function fingerprint(all: readonly ScenarioMessage[]): string {
  const hash = createHash('sha256');
  for (const message of all)
    hash.update(message.key).update(message.bytes).update(JSON.stringify(message.confirmations));
  return hash.digest('hex');
}

describe('the scenario of Fenmark Water', () => {
  it('is the same for the same seed and another for another', () => {
    expect(fingerprint(generateScenario(1).messages)).toBe(fingerprint(messages));
    expect(fingerprint(generateScenario(2).messages)).not.toBe(fingerprint(messages));
  });

  it('brings 2,400 messages in order of arrival within 120 days from 2026-01-05, each under its own key', () => {
    expect(messages).toHaveLength(2400);
    expect(new Set(messages.map((message) => message.key)).size).toBe(2400);
    const times = messages.map((message) => message.arrivesAtMs);
    expect([...times].sort((a, b) => a - b)).toEqual(times);
    expect(new Date(times[0] as number).toISOString().slice(0, 10)).toBe('2026-01-05');
    expect(new Date(times.at(-1) as number).toISOString().slice(0, 10) <= '2026-05-04').toBe(true);
  });

  it('fills all ten queues, the smallest with at least 40 messages', () => {
    for (const queue of queueIds)
      expect(messages.filter((each) => each.trueQueue === queue).length).toBeGreaterThan(40);
  });

  it('has about a quarter of forms, three languages, and machine mail', () => {
    expect(shareOf((each) => each.contentType === 'application/json')).toBeCloseTo(0.23, 1);
    expect(shareOf((each) => /\.test/.test(textOf(each)))).toBeGreaterThan(0.1);
    expect(shareOf((each) => /^Auto-Submitted: auto-replied/m.test(textOf(each)))).toBeCloseTo(0.03, 1);
    expect(messages.some((each) => /report-type=delivery-status/.test(textOf(each)))).toBe(true);
  });

  it('corrects about 3 in 100 confirmations, always towards the true queue, and never before the mail arrives', () => {
    const corrected = messages.filter((each) => each.confirmations.length === 2);
    expect(corrected.length / messages.length).toBeGreaterThan(0.02);
    expect(corrected.length / messages.length).toBeLessThan(0.04);
    for (const { confirmations, trueQueue, arrivesAtMs } of messages) {
      if (confirmations.length === 0) continue;
      expect(confirmations.at(-1)?.queue).toBe(trueQueue);
      expect(confirmations[0]?.atMs).toBeGreaterThan(arrivesAtMs);
      if (confirmations[1]) {
        expect(confirmations[0]?.queue).not.toBe(trueQueue);
        expect(confirmations[1].atMs).toBeGreaterThan(confirmations[0]?.atMs as number);
      }
    }
  });

  it('opens new-connections on day 50: nothing is confirmed into it before', () => {
    const opensAtMs = Date.UTC(2026, 1, 24);
    expect(scenario.openings).toEqual([{ queue: 'new-connections', atMs: opensAtMs, before: 'moving-home' }]);
    for (const each of messages) {
      if (each.arrivesAtMs < opensAtMs) expect(each.trueQueue).not.toBe('new-connections');
      for (const said of each.confirmations) {
        if (said.atMs < opensAtMs) expect(said.queue).not.toBe('new-connections');
      }
    }
  });

  it('speaks of the Heron exchange only while the campaign runs', () => {
    const heron = messages.filter((each) =>
      /Heron exchange|Heron letter|Heron appointment/.test(textOf(each)),
    );
    expect(heron.length).toBeGreaterThan(10);
    for (const each of heron) {
      expect(each.arrivesAtMs).toBeGreaterThanOrEqual(scenario.campaign.fromMs);
      expect(each.arrivesAtMs).toBeLessThan(scenario.campaign.toMs + 24 * 3600_000);
    }
  });

  it('brings two dozen requests for visits from day 96 on that nobody confirms', () => {
    const visits = messages.filter((each) =>
      /guided tour|school trip|open day|visit the treatment works/i.test(textOf(each)),
    );
    const asked = visits.filter((each) => each.confirmations.length === 0 && each.trueQueue === 'complaints');
    expect(asked.length).toBeGreaterThan(12);
    expect(asked.length).toBeLessThan(60);
    for (const each of visits) expect(each.arrivesAtMs).toBeGreaterThanOrEqual(Date.UTC(2026, 3, 11));
  });

  it('writes mail that is valid UTF-8 as a whole and that a mail parser reads back without U+FFFD', async () => {
    for (const each of messages.slice(0, 240)) {
      expect(Buffer.from(textOf(each))).toEqual(Buffer.from(each.bytes));
      if (each.contentType === 'application/json') continue;
      const mail = await simpleParser(Buffer.from(each.bytes));
      const text = `${mail.subject ?? ''}${mail.text ?? ''}${mail.html || ''}`;
      expect(text).not.toContain('\uFFFD');
      expect(text.length).toBeGreaterThan(20);
      expect(mail.date?.getTime()).toBeLessThanOrEqual(each.arrivesAtMs);
    }
  });

  it('leaves no hole of a template open', () => {
    for (const each of messages) expect(textOf(each)).not.toMatch(/\{[a-z-]+\}|undefined|\[object/);
  });

  it('exports one JSON line a confirmed message with its last confirmed queue', () => {
    const confirmed = messages.filter((each) => each.confirmations.length > 0);
    const lines = labelledLines(messages)
      .trim()
      .split('\n')
      .map((line) => JSON.parse(line));
    expect(lines.map((line) => line.queue)).toEqual(confirmed.map((each) => each.trueQueue));
    for (const line of lines) expect(typeof (line.mail ?? line.form.id)).toBe('string');
  });
});

describe('the desk of Fenmark Water', () => {
  it('is a valid desk file with ten queues, nine before new-connections opens', () => {
    expect(readDesk(deskJson(), 'events/desk.json').queues.map((queue) => queue.id)).toEqual([...queueIds]);
    const early = readDesk(deskJson(scenario, Date.UTC(2026, 0, 5)), 'events/desk.json');
    expect(early.queues.map((queue) => queue.id)).toEqual(queueIds.filter((id) => id !== 'new-connections'));
  });
});

describe('events/', () => {
  it('holds what the scenario writes, byte for byte', () => {
    for (const [path, bytes] of eventFiles(samples())) {
      expect(readFileSync(new URL(`../../events/${path}`, import.meta.url)), path).toEqual(
        Buffer.from(bytes),
      );
    }
  });

  it('encodes keys as S3 notifications do', () => {
    expect(formEncodedKey('confirmations/drop 1.json')).toBe('confirmations/drop+1.json');
    expect(formEncodedKey('inbound/a+b/ü')).toBe('inbound/a%2Bb/%C3%BC');
  });
});

describe('the generator’s parts', () => {
  it('expands choices and holes, given words first', () => {
    const say = (template: string) =>
      writeSentence(template, { town: ['Harrowfen'] }, { who: 'Maud' }, createChance(1));
    expect(say('{who} lives in {town} (near the weir|near the weir).')).toBe(
      'Maud lives in Harrowfen near the weir.',
    );
    expect(() => say('{nobody}')).toThrow('no words for {nobody}');
  });

  it('slips in every word at share 1 and in none at share 0, never in digits', () => {
    expect(addTypos('account FW-12345678 water', 0, createChance(3))).toBe('account FW-12345678 water');
    const slipped = addTypos('account FW-12345678 water', 1, createChance(3));
    expect(slipped).toContain('12345678');
    expect(slipped).not.toBe('account FW-12345678 water');
  });

  it('writes quoted-printable with lines of at most 76 and no bare trailing space (RFC 2045 section 6.7)', () => {
    const { body } = textPart('text/plain', `${'ü'.repeat(40)} \nend`, 'utf-8', 'quoted-printable');
    const lines = Buffer.from(body).toString('latin1').split('\r\n');
    expect(Math.max(...lines.map((line) => line.length))).toBeLessThanOrEqual(76);
    expect(lines.at(-2)).toMatch(/=20$/);
  });

  it('writes encoded words as RFC 2047 does', () => {
    // RFC 2047 section 8 spells Keld Jørn in ISO 8859-1 as =F8; UTF-8 spells ø as C3 B8.
    expect(headerText('Jørn', 'Q')).toBe('=?utf-8?Q?J=C3=B8rn?=');
    expect(headerText('plain', 'B')).toBe('plain');
  });
});
