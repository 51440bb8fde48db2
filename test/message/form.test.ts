import { Buffer } from 'node:buffer';
import { describe, expect, test } from 'vitest';
import { parseForm } from '../../src/message/form.ts';

const parse = (data: unknown) => parseForm(Buffer.from(JSON.stringify(data)));

describe('parseForm', () => {
  test('gives the whole message', () => {
    expect(
      parse({
        form: 'contact',
        at: '2026-03-01T10:00:00Z',
        from: 'Anna@Berg.example',
        fields: { topic: 'meter', message: 'The meter is broken.\r\nPlease come.', phone: '' },
      }),
    ).toEqual({
      channel: 'form',
      messageId: '',
      from: { address: 'anna@berg.example', domain: 'berg.example' },
      recipients: [],
      subject: '',
      text: 'meter\n\nThe meter is broken.\nPlease come.',
      ownText: 'meter\n\nThe meter is broken.\nPlease come.',
      attachments: [],
      facts: {
        isReply: false,
        isAutomatic: false,
        isList: false,
        isDeliveryReport: false,
        spam: 'missing',
        virus: 'missing',
      },
      sentAtMs: Date.UTC(2026, 2, 1, 10),
      form: {
        id: 'contact',
        fields: { topic: 'meter', message: 'The meter is broken.\nPlease come.', phone: '' },
      },
      defects: [],
    });
  });

  const values: [value: unknown, text: string][] = [
    ['text', 'text'],
    [12.5, '12.5'],
    [false, 'false'],
    [['a', 'b'], 'a, b'],
    [[], ''],
  ];
  test.each(values)('a field of %j counts as %j', (value, text) => {
    expect(parse({ form: 'f', fields: { x: value } }).form?.fields).toEqual({ x: text });
  });

  const times: [at: unknown, sentAtMs: number | null, codes: string[]][] = [
    ['2026-03-01T10:00:00Z', Date.UTC(2026, 2, 1, 10), []],
    ['2026-03-01T10:00:00.250Z', Date.UTC(2026, 2, 1, 10, 0, 0, 250), []],
    ['2026-03-01T10:00+02:00', Date.UTC(2026, 2, 1, 8), []],
    [undefined, null, []],
    [null, null, []],
    ['2026-03-01T10:00:00', null, ['date-unreadable']],
    ['2026-13-01T10:00:00Z', null, ['date-unreadable']],
    [1772359200, null, ['date-unreadable']],
  ];
  test.each(times)('at %j', (at, sentAtMs, codes) => {
    const message = parse({ form: 'f', at, fields: { x: 'y' } });
    expect(message.sentAtMs).toBe(sentAtMs);
    expect(message.defects.map(({ code }) => code)).toEqual(codes);
  });

  test.each([
    ['', '{'],
    ['not JSON', 'x'],
    ['a list', '[]'],
    ['nothing', 'null'],
    ['a number', '5'],
  ])('unreadable: %s', (_what, json) => {
    const message = parseForm(Buffer.from(json));
    expect(message.defects[0]).toEqual({ code: 'form-unreadable', place: 'message' });
    expect(message.form).toEqual({ id: '', fields: {} });
    expect(message.text).toBe('');
  });

  test('records that whatever took the form suspects a program, and nothing when it does not', () => {
    const form = { form: 'contact', fields: { message: 'hello' } };
    const suspect = [{ code: 'form-suspect', place: 'suspicion' }];
    expect(parse({ ...form, suspicion: 'trap-filled' }).defects).toEqual(suspect);
    expect(parse({ ...form, suspicion: 'a reason not known yet' }).defects).toEqual(suspect);
    expect(parse({ ...form, suspicion: null }).defects).toEqual([]);
    expect(parse(form).defects).toEqual([]);
  });
});
