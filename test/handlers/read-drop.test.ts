import { describe, expect, it } from 'vitest';
import { readDrop } from '../../src/handlers/read-drop.ts';

const good = { message: 'mail/1.eml', queue: 'billing', by: 'a.tolland', at: '2026-03-01T10:00:00Z' };
const read = (drop: unknown) =>
  readDrop(
    new TextEncoder().encode(typeof drop === 'string' ? drop : JSON.stringify(drop)),
    'confirmations/x.json',
  );

describe('a dropped confirmation', () => {
  it.each([
    [good],
    [{ ...good, at: '2026-03-01T10:00+02:00' }],
    [{ ...good, at: '2026-03-01T10:00:00.123456Z' }],
    [{ ...good, by: 'Ünal, second line' }],
  ])('is read: %j', (drop) => {
    expect(read(drop)).toEqual(drop);
  });

  it.each<[string, unknown, string]>([
    ['not JSON', '{"message":', ': expected JSON in UTF-8, got 11 other bytes'],
    ['a list', [], ': expected an object, got a list of 0'],
    [
      'no message',
      { ...good, message: undefined },
      '#/message: expected a string, the key of the message without inbound/, got nothing',
    ],
    [
      'an empty message',
      { ...good, message: '' },
      '#/message: expected the key of the message without inbound/, in one line, got ""',
    ],
    ['two lines', { ...good, by: 'a\nb' }, '#/by: expected who confirmed, in one line, got "a\\nb"'],
    ['a queue that is a number', { ...good, queue: 7 }, '#/queue: expected a string, a queue id, got 7'],
    [
      'a long name',
      { ...good, by: 'x'.repeat(201) },
      `#/by: expected at most 200 characters, got "${'x'.repeat(58)}…`,
    ],
    [
      'a date without time',
      { ...good, at: '2026-03-01' },
      '#/at: expected a time such as 2026-03-01T10:00:00Z, got "2026-03-01"',
    ],
    [
      'a time without zone',
      { ...good, at: '2026-03-01T10:00:00' },
      '#/at: expected a time such as 2026-03-01T10:00:00Z, got "2026-03-01T10:00:00"',
    ],
    [
      'the 30th of February in no calendar',
      { ...good, at: '2026-13-40T10:00:00Z' },
      '#/at: expected a time such as 2026-03-01T10:00:00Z, got "2026-13-40T10:00:00Z"',
    ],
    [
      'an unknown member',
      { ...good, 'que/ue': 'billing' },
      ': expected only message, queue, by and at, got another member',
    ],
  ])('is refused: %s', (_title, drop, expected) => {
    expect(() => read(drop)).toThrow(`confirmation-invalid at confirmations/x.json${expected}`);
  });
});
