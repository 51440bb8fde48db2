import { describe, expect, test } from 'vitest';
import { readAddress } from '../../src/message/addresses.ts';
import { codesOf, parseWire } from './mail-source.ts';

describe('readAddress', () => {
  const valid: [text: string, address: string, domain: string][] = [
    ['a@b.example', 'a@b.example', 'b.example'],
    [' Anna.Berg@B.Example ', 'anna.berg@b.example', 'b.example'],
    ['a+tag@b.example', 'a+tag@b.example', 'b.example'],
    ['a@b.example.', 'a@b.example', 'b.example'],
    // RFC 3492 section 7.1 style check: bücher becomes xn--bcher-kva.
    ['a@bücher.example', 'a@xn--bcher-kva.example', 'xn--bcher-kva.example'],
    ['a@xn--bcher-kva.example', 'a@xn--bcher-kva.example', 'xn--bcher-kva.example'],
    ['a@localhost', 'a@localhost', 'localhost'],
    ['a@[192.0.2.1]', 'a@[192.0.2.1]', '[192.0.2.1]'],
    ['"a@b"@c.example', '"a@b"@c.example', 'c.example'],
  ];
  test.each(valid)('%s', (text, address, domain) => {
    expect(readAddress(text)).toEqual({ address, domain });
  });

  const invalid = [
    '',
    'nobody',
    '@b.example',
    'a@',
    'a b@c.example',
    'a@b c',
    '<a@b.example>',
    'a\0@b.example',
    `${'a'.repeat(320)}@b.example`,
    'a@..',
    'a@b_\u0000',
  ];
  test.each(invalid)('%j is no address', (text) => {
    expect(readAddress(text)).toBeNull();
  });
});

describe('sender and recipients', () => {
  test('Sender stands in when From cannot be read', async () => {
    const message = await parseWire('From: nobody\nSender: a@b.example\nSubject: x\n\ntext\n');
    expect(message.from?.address).toBe('a@b.example');
    expect(codesOf(message)).toEqual(['address-unreadable']);
  });

  test('without either the sender is unknown, which is on record', async () => {
    const message = await parseWire('Subject: x\n\ntext\n');
    expect(message.from).toBeNull();
    expect(codesOf(message)).toEqual(['from-missing']);
  });

  test.each([
    ['To: a@b.example; c@d.example', ['a@b.example', 'c@d.example']],
    ['To: undisclosed-recipients:;', []],
    ['To: "a, b" <c@d.example>', ['c@d.example']],
    ['To: <a@b.example>, <a@B.example>', ['a@b.example']],
    ['To: A <a@b.example', ['a@b.example']],
    ['To:', []],
  ])('%s', async (field, addresses) => {
    const message = await parseWire(`From: x@y.example\n${field}\nSubject: x\n\ntext\n`);
    expect(message.recipients.map(({ address }) => address)).toEqual(addresses);
    expect(codesOf(message)).toEqual([]);
  });
});
