import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Desk } from '../../src/desk/desk.ts';
import { createExtractor } from '../../src/features/extractor.ts';
import { schemaOf } from '../../src/features/schema-of.ts';
import { createSipHash } from '../../src/features/siphash.ts';
import { parseMail } from '../../src/message/mail.ts';
import type { Message } from '../../src/message/message.ts';
import { exampleDesk, exampleKey, formOf, mailOf } from './example.ts';

const extractor = createExtractor(exampleDesk, exampleKey);
const facts = mailOf().facts;

/** Slot id to value, read back through the schema. */
function slotsOf(message: Message, desk: Desk = exampleDesk): Record<string, string> {
  const { schema, extract } = createExtractor(desk, exampleKey);
  const { slots } = extract(message);
  return Object.fromEntries(schema.slots.map((slot, i) => [slot.id, slot.values[slots[i]!]!]));
}

/** Tokens of one region as text, sorted. */
function tokensOf(message: Message, region: string): string[] {
  return [...extractor.words(message)]
    .filter(([key]) => key.startsWith(`${region}:`))
    .map(([, token]) => token)
    .sort();
}

describe('slots', () => {
  it('of a plain mail', () => {
    expect(slotsOf(mailOf())).toEqual({
      channel: 'mail',
      recipient: 'help@fenmarkwater.example',
      sender: 'other',
      thread: 'new',
      origin: 'person',
      attachments: 'none',
      length: 'to-80',
      day: 'mon', // 2 March 2026
      hour: 'morning',
      script: 'latin',
      'reference:account': 'absent',
      form: 'missing',
      'field:contact/topic': 'missing',
    });
  });

  it('of a form', () => {
    const form = formOf('contact', { topic: ' a LEAK', details: 'Water in the road, account FW-12345678' });
    expect(slotsOf(form)).toMatchObject({
      channel: 'form',
      recipient: 'missing',
      sender: 'missing',
      thread: 'missing',
      origin: 'missing',
      attachments: 'missing',
      form: 'contact',
      'field:contact/topic': 'A leak',
      'reference:account': 'present',
    });
  });

  it.each<[string, Partial<Message>, Record<string, string>]>([
    [
      'subaddress of an own address',
      { recipients: [{ address: 'billing+2026@fenmarkwater.example', domain: 'fenmarkwater.example' }] },
      { recipient: 'billing@fenmarkwater.example' },
    ],
    [
      'first own address wins',
      {
        recipients: [
          { address: 'x@y.test', domain: 'y.test' },
          { address: 'billing@fenmarkwater.example', domain: 'fenmarkwater.example' },
        ],
      },
      { recipient: 'billing@fenmarkwater.example' },
    ],
    [
      'no own address among the recipients',
      { recipients: [{ address: 'x@y.test', domain: 'y.test' }] },
      { recipient: 'other' },
    ],
    [
      'own domain',
      { from: { address: 'a@fenmarkwater.example', domain: 'fenmarkwater.example' } },
      { sender: 'own' },
    ],
    [
      'below the own domain',
      { from: { address: 'a@mail.fenmarkwater.example', domain: 'mail.fenmarkwater.example' } },
      { sender: 'own' },
    ],
    [
      'a declared class, by subdomain',
      { from: { address: 'a@roads.council.example', domain: 'roads.council.example' } },
      { sender: 'council' },
    ],
    [
      'a name that only ends alike',
      { from: { address: 'a@notcouncil.example', domain: 'notcouncil.example' } },
      { sender: 'other' },
    ],
    ['no sender', { from: null }, { sender: 'missing' }],
    ['an address without a domain', { from: { address: 'root', domain: '' } }, { sender: 'missing' }],
    ['a reply', { facts: { ...facts, isReply: true } }, { thread: 'reply' }],
    ['an automatic reply', { facts: { ...facts, isAutomatic: true } }, { origin: 'automatic' }],
    [
      'a delivery report is automatic too, and named',
      { facts: { ...facts, isAutomatic: true, isDeliveryReport: true } },
      { origin: 'delivery-report' },
    ],
    ['list mail', { facts: { ...facts, isList: true } }, { origin: 'list' }],
    [
      'one kind of attachment, twice',
      {
        attachments: [
          { kind: 'pdf', bytes: 10 },
          { kind: 'pdf', bytes: 12 },
        ],
      },
      { attachments: 'pdf' },
    ],
    [
      'kinds of attachment',
      {
        attachments: [
          { kind: 'pdf', bytes: 10 },
          { kind: 'image', bytes: 12 },
        ],
      },
      { attachments: 'several' },
    ],
    [
      'a signature is no attachment',
      { attachments: [{ kind: 'signature', bytes: 10 }] },
      { attachments: 'none' },
    ],
    [
      'an unknown kind is the list’s other',
      { attachments: [{ kind: 'other', bytes: 10 }] },
      { attachments: 'other' },
    ],
    ['no text', { ownText: '' }, { length: 'empty' }],
    ['80 characters', { ownText: 'x'.repeat(80) }, { length: 'to-80' }],
    ['81 characters', { ownText: 'x'.repeat(81) }, { length: 'to-250' }],
    ['2,501 characters', { ownText: 'x'.repeat(2501) }, { length: 'over-2500' }],
    ['no time', { sentAtMs: null }, { day: 'missing', hour: 'missing' }],
    ['a time outside the calendar', { sentAtMs: 9e15 }, { day: 'missing', hour: 'missing' }],
    // British summer time: 23:30 UTC on Sunday 5 July 2026 is 00:30 on Monday.
    [
      'night of the desk’s next day',
      { sentAtMs: Date.UTC(2026, 6, 5, 23, 30) },
      { day: 'mon', hour: 'night' },
    ],
    ['a reference in the subject', { subject: 'Account fw-00000001.' }, { 'reference:account': 'present' }],
    ['a reference inside a longer number', { ownText: 'FW-123456789' }, { 'reference:account': 'absent' }],
    [
      'a reference in full-width digits',
      { ownText: 'ＦＷ-１２３４５６７８' },
      { 'reference:account': 'present' },
    ],
  ])('%s', (_title, changes, expected) => {
    expect(slotsOf(mailOf(changes))).toMatchObject(expected);
  });

  it('count an undeclared form and an undeclared choice as other', () => {
    expect(slotsOf(formOf('prize', { a: 'b' }))).toMatchObject({ form: 'other' });
    expect(slotsOf(formOf('contact', { topic: 'Something else' }))).toMatchObject({
      'field:contact/topic': 'other',
    });
  });

  it('read the clock of the desk’s own zone', () => {
    const tokyo = { ...exampleDesk, timeZone: 'Asia/Tokyo' };
    // 9:30 UTC is 18:30 in Tokyo.
    expect(slotsOf(mailOf(), tokyo)).toMatchObject({ day: 'mon', hour: 'evening' });
  });

  it.each([
    // Forward and back by half an hour: 4 October and 5 April 2026, 15:30 and 15:00 UTC.
    ['Australia/Lord_Howe', Date.UTC(2026, 9, 3, 12), Date.UTC(2026, 9, 3, 19)],
    ['Australia/Lord_Howe', Date.UTC(2026, 3, 4, 12), Date.UTC(2026, 3, 4, 19)],
    // A quarter of an hour off the full hour; a day left out; a clock 44 minutes and 30 seconds behind.
    ['Asia/Kathmandu', Date.UTC(2026, 6, 1), Date.UTC(2026, 6, 2)],
    ['Pacific/Apia', Date.UTC(2011, 11, 29), Date.UTC(2011, 11, 31)],
    ['Africa/Monrovia', Date.UTC(1971, 5, 1), Date.UTC(1971, 5, 2)],
    ['Europe/London', Date.UTC(2026, 9, 24, 22), Date.UTC(2026, 9, 25, 4)],
  ])('know weekday and hour in %s at every minute', (timeZone, fromMs, toMs) => {
    const clock = new Intl.DateTimeFormat('en-US', {
      timeZone,
      weekday: 'short',
      hour: 'numeric',
      hourCycle: 'h23',
    });
    const extractor = createExtractor({ ...exampleDesk, timeZone }, exampleKey);
    const at = (id: string) => extractor.schema.slots.findIndex((slot) => slot.id === id);
    const valueAt = (slots: readonly number[], id: string) =>
      extractor.schema.slots[at(id)]!.values[slots[at(id)]!];
    for (let ms = fromMs; ms < toMs; ms += 59_800) {
      const [, day, hour] = /([A-Z][a-z]{2})\D+(\d+)/.exec(clock.format(ms))!;
      const { slots } = extractor.extract(mailOf({ sentAtMs: ms }));
      expect(valueAt(slots, 'day')).toBe(day.toLowerCase());
      expect(valueAt(slots, 'hour')).toBe(
        ['night', 'morning', 'afternoon', 'evening'][Math.floor(Number(hour) / 6)],
      );
    }
  });

  it('take a time at the calendar’s very end', () => {
    // 13 September 275760 is a Saturday; 00:00 UTC is 01:00 in Britain's summer.
    expect(slotsOf(mailOf({ sentAtMs: 8.64e15 }))).toMatchObject({ day: 'sat', hour: 'night' });
  });

  it('take a shared host’s customers for two senders, though they share its domain', () => {
    // github.io stands in the private section of the Public Suffix List.
    const desk = { ...exampleDesk, ownDomains: ['fenmark.github.io'] };
    const from = (domain: string) => mailOf({ from: { address: `a@${domain}`, domain } });
    expect(slotsOf(from('fenmark.github.io'), desk).sender).toBe('own');
    expect(slotsOf(from('other.github.io'), desk).sender).toBe('other');
  });
});

describe('regions', () => {
  const mail = mailOf({ subject: 'Bill', ownText: 'A big bill, a BIG bill' });

  it('subject: the subject’s words', () => {
    expect(tokensOf(mail, 'subject')).toEqual(['bill']);
  });

  it('word: words of subject and text, each once', () => {
    expect(tokensOf(mail, 'word')).toEqual(['a', 'big', 'bill']);
  });

  it('pair: neighbours from the beginning to the end', () => {
    expect(tokensOf(mail, 'pair')).toEqual(['^ bill', 'a big', 'big bill', 'bill $', 'bill a']);
  });

  it('gram: four letters of each word with its spaces', () => {
    expect(tokensOf(mailOf({ subject: '', ownText: 'a big leak' }), 'gram')).toEqual([
      ' a ',
      ' big',
      ' lea',
      'big ',
      'eak ',
      'leak',
    ]);
  });

  it('of a form: free fields in order, without the declared choice', () => {
    const form = formOf('contact', { topic: 'A leak', first: 'one two', second: 'three' });
    expect(tokensOf(form, 'word')).toEqual(['one', 'three', 'two']);
    expect(tokensOf(form, 'pair')).toContain('two three');
  });

  it('of a form: a choice that is not declared is somebody’s own words', () => {
    expect(tokensOf(formOf('contact', { topic: 'my pipe burst' }), 'word')).toEqual(['burst', 'my', 'pipe']);
  });

  it('quoted history gives its words, and neither pairs nor grams', () => {
    const reply = mailOf({ text: 'yes please\n> the leak', ownText: 'yes please' });
    expect(tokensOf(reply, 'word')).toEqual(['leak', 'please', 'question', 'the', 'yes']);
    expect(tokensOf(reply, 'pair')).toEqual(['^ question', 'please $', 'question yes', 'yes please']);
    expect(tokensOf(reply, 'gram')).not.toContain('leak');
  });

  it('quoted text, however long, takes no place from what the writer wrote', () => {
    const quoted = Array.from({ length: 9000 }, (_, i) => `w${i.toString(36)}`).join(' ');
    const reply = mailOf({ subject: '', text: `> ${quoted}\nstop the leak`, ownText: 'stop the leak' });
    const words = tokensOf(reply, 'word');
    expect(words).toHaveLength(1024);
    expect(words).toEqual(expect.arrayContaining(['leak', 'stop', 'the']));
  });

  it('text that a reader of the mail does not see gives no token, quoted or not', async () => {
    const html =
      '<p>My bill</p><p style="display:none">burst</p>' +
      '<blockquote><p>your letter</p><p hidden>flood</p></blockquote>';
    const raw = `From: ana@home.test\r\nSubject: x\r\nContent-Type: text/html\r\n\r\n${html}\r\n`;
    const message = await parseMail(Buffer.from(raw));
    expect(tokensOf(message, 'word')).toEqual(['bill', 'letter', 'my', 'x', 'your']);
  });

  it('hold hashes ascending, each below 2^40', () => {
    const { regions } = extractor.extract(mail);
    expect(regions.map((each) => each.length)).toEqual([1, 3, 5, 6]); // ' a ', ' big', 'big ', ' bil', 'bill', 'ill '
    const sipHash = createSipHash(exampleKey);
    const hash = sipHash.textToken;
    expect(regions[0]).toEqual(Float64Array.of(hash('bill')));
    expect(regions[1]).toEqual(
      Float64Array.from([hash('a'), hash('big'), hash('bill')].sort((a, b) => a - b)),
    );
    const grams = [' a ', ' big', 'big ', ' bil', 'bill', 'ill '].map(hash);
    expect(regions[3]).toEqual(Float64Array.from(grams.sort((a, b) => a - b)));
  });

  it('hash a pair by the hashes of its words', () => {
    const { textToken, pairToken } = createSipHash(exampleKey);
    const pair = (a: string, b: string) => pairToken(textToken(a), textToken(b));
    const { regions } = extractor.extract(mailOf({ subject: '', ownText: 'wörter 水' }));
    const expected = [pair('^', 'wörter'), pair('wörter', '水'), pair('水', '$')];
    expect(regions[2]).toEqual(Float64Array.from(expected.sort((a, b) => a - b)));
  });

  it('are the same after a hundred thousand other words', () => {
    const before = extractor.extract(mail);
    for (let m = 0; m < 20; m++) {
      const other = Array.from({ length: 5000 }, (_, i) => `w${m}x${i}`).join(' ');
      extractor.extract(mailOf({ ownText: other }));
    }
    expect(extractor.extract(mail)).toEqual(before);
  });

  it('keep the first tokens of a flood', () => {
    const many = Array.from({ length: 9000 }, (_, i) => `w${i.toString(36)}`);
    const flooded = mailOf({ subject: many.slice(0, 100).join(' '), ownText: many.join(' ') });
    const { regions } = extractor.extract(flooded);
    expect(regions.map((each) => each.length)).toEqual([64, 1024, 2048, 3072]);
    expect(tokensOf(flooded, 'subject')).toEqual(many.slice(0, 64).sort());
  });

  it('are the same for the same message, whatever was read before', () => {
    const fresh = createExtractor(exampleDesk, exampleKey);
    extractor.extract(mailOf({ ownText: 'something else entirely' }));
    expect(extractor.extract(mail)).toEqual(fresh.extract(mail));
  });
});

describe('any message', () => {
  it('gives one value a slot and bounded distinct ascending tokens, and words() names every token', () => {
    const text = fc.string({ unit: 'binary', maxLength: 400 });
    fc.assert(
      fc.property(text, text, fc.integer(), (subject, ownText, sentAtMs) => {
        const message = mailOf({ subject, ownText, sentAtMs });
        const { slots, regions } = extractor.extract(message);
        const named = extractor.words(message);
        slots.forEach((value, i) => {
          expect(value).toBeGreaterThanOrEqual(0);
          expect(value).toBeLessThan(extractor.schema.slots[i]!.values.length);
        });
        let tokens = 0;
        regions.forEach((region, i) => {
          tokens += region.length;
          expect(region.length).toBeLessThanOrEqual(extractor.schema.regions[i]!.tokensMax);
          for (let t = 1; t < region.length; t++) expect(region[t]!).toBeGreaterThan(region[t - 1]!);
        });
        expect(named.size).toBe(tokens);
      }),
      { seed: 20262, numRuns: 200 },
    );
  });
});

describe('schema', () => {
  it('starts every slot with missing and other, and repeats no value', () => {
    for (const slot of extractor.schema.slots) {
      expect(slot.values.slice(0, 2)).toEqual(['missing', 'other']);
      expect(new Set(slot.values).size).toBe(slot.values.length);
    }
  });

  it('has an id of 16 hex digits that the extractor and schemaOf agree on', () => {
    expect(extractor.schema.id).toMatch(/^[0-9a-f]{16}$/);
    expect(schemaOf(exampleDesk, exampleKey)).toEqual(extractor.schema);
  });

  it('has another id under another key or other slots, and the same under other queues', () => {
    const { id } = extractor.schema;
    expect(schemaOf(exampleDesk, new Uint8Array(16)).id).not.toBe(id);
    expect(schemaOf({ ...exampleDesk, forms: ['contact'] }, exampleKey).id).not.toBe(id);
    expect(schemaOf({ ...exampleDesk, queues: exampleDesk.queues.slice(1) }, exampleKey).id).toBe(id);
  });
});
