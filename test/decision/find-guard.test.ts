import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { findGuard } from '../../src/decision/find-guard.ts';
import type { Desk, Guard } from '../../src/desk/desk.ts';
import type { Message } from '../../src/message/message.ts';
import { exampleDesk, formOf, mailOf } from '../features/example.ts';

const guardOf = (id: string, changes: Partial<Guard>): Guard => ({
  id,
  queue: 'leaks',
  phrases: [],
  senders: [],
  fields: [],
  ...changes,
});
const deskWith = (...guards: Guard[]): Desk => ({ ...exampleDesk, guards });
const met = (message: Message, ...guards: Guard[]) => findGuard(message, deskWith(...guards))?.id ?? null;

describe('a phrase', () => {
  const danger = guardOf('danger', {
    phrases: ['sewage in the house', 'électrocuté', 'leak', 'fuite d’eau'],
  });

  it.each([
    ['in the subject', { subject: 'Leak!', ownText: '' }],
    ['in the text, over a line end and punctuation', { ownText: 'There is SEWAGE\nin "the" -- house.' }],
    ['at the very end', { ownText: 'please help: leak' }],
    ['in other case and composition', { ownText: 'il a été E\u0301LECTROCUTE\u0301' }],
    ['with a hyphenation mark inside', { ownText: 'le\u00adak' }],
    ['with another apostrophe', { ownText: "une fuite d'eau" }],
  ])('%s meets its guard', (_title, changes) => {
    expect(met(mailOf(changes), danger)).toBe('danger');
  });

  it.each([
    ['inside a longer word', { ownText: 'leaking bleak leaks' }],
    ['with a word between', { ownText: 'sewage in all the house' }],
    ['half in the subject, half in the text', { subject: 'sewage in', ownText: 'the house' }],
    ['broken off by the end', { ownText: 'sewage in the' }],
    ['only in quoted history', { text: 'thanks\n> leak', ownText: 'thanks' }],
  ])('%s does not', (_title, changes) => {
    expect(met(mailOf(changes), danger)).toBeNull();
  });

  it('is found among hundreds that begin alike, the first guard’s first', () => {
    const long = guardOf('long', { phrases: Array.from({ length: 500 }, (_, i) => `burst pipe ${i}`) });
    const short = guardOf('short', { phrases: ['burst'] });
    expect(met(mailOf({ ownText: 'a burst pipe 499 again' }), long, short)).toBe('long');
    expect(met(mailOf({ ownText: 'a burst pipe 500 again' }), long, short)).toBe('short');
    expect(met(mailOf({ ownText: 'a burst pipe 499 again' }), short, long)).toBe('short');
    expect(met(mailOf({ ownText: 'pipe 499' }), long, short)).toBeNull();
  });

  it('of more first words than one expression takes is found all the same', () => {
    const many = guardOf('many', { phrases: Array.from({ length: 200 }, (_, i) => `word${i} now`) });
    expect(met(mailOf({ ownText: 'please word173 NOW!' }), many)).toBe('many');
    expect(met(mailOf({ ownText: 'please word173 later' }), many)).toBeNull();
  });

  it('is found where its words stand in a row, and nowhere else', () => {
    const word = fc.constantFrom(
      'gas',
      'leak',
      'eau',
      'électrique',
      '9',
      'gasx',
      'é',
      'x'.repeat(40),
      'x'.repeat(39),
    );
    const between = fc.constantFrom(' ', '\n', ' – ', '…', "'", '  ', '。');
    const phrase = fc.array(word, { minLength: 1, maxLength: 3 });
    const text = fc.array(fc.tuple(fc.oneof(word, fc.constant('x'.repeat(45))), between), { maxLength: 8 });
    fc.assert(
      fc.property(fc.array(phrase, { minLength: 1, maxLength: 3 }), text, (phrases, parts) => {
        const guard = guardOf('guard', { phrases: phrases.map((words) => words.join(' ')) });
        // Of a longer word the first 40 letters count.
        const row = ` ${parts.map(([each]) => each.slice(0, 40)).join(' ')} `;
        const isThere = phrases.some((words) => row.includes(` ${words.join(' ')} `));
        const ownText = parts.map(([each, gap]) => each + gap).join('');
        expect(met(mailOf({ subject: '', ownText }), guard)).toBe(isThere ? 'guard' : null);
      }),
      { seed: 20270, numRuns: 2000 },
    );
  });

  it('is looked for in every field of a form, each by itself', () => {
    expect(met(formOf('contact', { name: 'A', details: 'a leak' }), danger)).toBe('danger');
    expect(met(formOf('contact', { a: 'sewage in', b: 'the house' }), danger)).toBeNull();
  });

  it('of a script without spaces is looked for as it stands', () => {
    const japanese = guardOf('japanese', { phrases: ['水漏れ'] });
    expect(met(mailOf({ ownText: '家の前で水漏れしています' }), japanese)).toBe('japanese');
    expect(met(mailOf({ ownText: '水道料金' }), japanese)).toBeNull();
  });
});

describe('a sender', () => {
  const vip = guardOf('vip', { senders: ['chair@council.example', '@gov.example'] });
  const from = (address: string) =>
    mailOf({ from: { address, domain: address.slice(address.indexOf('@') + 1) } });

  it.each([
    ['chair@council.example', 'vip'],
    ['clerk@council.example', null],
    ['a@gov.example', 'vip'],
    ['a@water.gov.example', 'vip'],
    ['a@notgov.example', null],
  ])('%s', (address, expected) => {
    expect(met(from(address), vip)).toBe(expected);
  });

  it('that is missing meets none', () => {
    expect(met(mailOf({ from: null }), vip)).toBeNull();
  });
});

describe('a field', () => {
  const flooding = guardOf('flooding', {
    fields: [{ form: 'contact', field: 'topic', values: ['Sewer flooding'] }],
  });

  it.each([
    ['the choice, in any case', 'contact', { topic: ' sewer FLOODING ' }, 'flooding'],
    ['another choice', 'contact', { topic: 'A bill' }, null],
    ['another form', 'leak', { topic: 'Sewer flooding' }, null],
    ['no such field', 'contact', { details: 'Sewer flooding' }, null],
    ['a field that every object inherits', 'contact', {}, null],
  ])('%s', (_title, form, fields, expected) => {
    expect(met(formOf(form, fields as Record<string, string>), flooding)).toBe(expected);
  });

  it('of a mail does not exist', () => {
    expect(met(mailOf({ ownText: 'Sewer flooding' }), flooding)).toBeNull();
  });
});

describe('of several guards', () => {
  const bySender = guardOf('by-sender', { senders: ['@home.test'] });
  const byPhrase = guardOf('by-phrase', { phrases: ['high'] });
  const byLaterPhrase = guardOf('by-later-phrase', { phrases: ['bill'] });

  it('the first in the desk’s order acts, however it was met', () => {
    expect(met(mailOf(), bySender, byPhrase)).toBe('by-sender');
    expect(met(mailOf(), byPhrase, bySender)).toBe('by-phrase');
    expect(met(mailOf(), byPhrase, byLaterPhrase)).toBe('by-phrase');
  });

  it('none acts on a message that meets none, nor on a desk that has none', () => {
    expect(met(mailOf({ subject: 'x', ownText: 'y', from: null }), bySender, byPhrase)).toBeNull();
    expect(findGuard(mailOf(), exampleDesk)).toBeNull();
  });
});
