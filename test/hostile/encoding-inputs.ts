import { Buffer } from 'node:buffer';
import { address, type HostileInput, mail, plea, streamOf } from './hostile-input.ts';

const typed = (type: string, body: string, encoding = '') =>
  mail(
    `${address}Subject: Question\r\nMIME-Version: 1.0\r\nContent-Type: ${type}\r\n${encoding === '' ? '' : `Content-Transfer-Encoding: ${encoding}\r\n`}`,
    body,
  );
const latin1 = (text: string) => Buffer.from(text, 'utf8').toString('latin1');
const base64 = (bytes: Buffer | string) =>
  Buffer.from(bytes as string)
    .toString('base64')
    .replace(/(.{76})/g, '$1\r\n');

/** Transfer encodings and charsets that lie, break off or flood. */
export const encodingInputs: readonly HostileInput[] = [
  {
    name: 'an unknown transfer encoding',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', plea, 'x-uuencode'),
    defects: ['encoding-unknown'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'base64 with foreign characters in between',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', base64(plea).replace(/^.{10}/, '$&!'), 'base64'),
    defects: ['encoding-damaged'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'base64 of several pieces, each padded',
    channel: 'mail',
    build: () =>
      typed(
        'text/plain; charset=utf-8',
        base64(`${plea} `) + base64('one more') + base64(' and one'),
        'base64',
      ),
    defects: [],
    isExact: true,
    keeps: `${plea} one more and one`,
    expectedDecision: 'by-words',
  },
  {
    name: 'plain text that claims to be base64',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${plea} (really!) -- "quoted", isn't it?`, 'base64'),
    defects: ['encoding-damaged'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'base64 that breaks off',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', base64(`${plea} more words`).slice(0, -7), 'base64'),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '10 MB of text in base64',
    channel: 'mail',
    build: () =>
      streamOf(
        `${address}Subject: Question\r\nContent-Type: text/plain\r\nContent-Transfer-Encoding: base64\r\n\r\n`,
        `${Buffer.from('water meter ').toString('base64')}\r\n`,
        10 * 1024 * 1024,
      ),
    defects: ['text-cut'],
    keeps: 'water meter water meter',
    expectedDecision: 'by-words',
  },
  {
    name: 'a base64 body inside a base64 label inside quotes',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', plea, '"base64"'),
    defects: ['encoding-unknown'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '250 KB of equals signs in quoted-printable',
    channel: 'mail',
    build: () =>
      typed('text/plain; charset=utf-8', `${plea}\r\n${'='.repeat(250 * 1024)}`, 'quoted-printable'),
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '80,000 soft line breaks in quoted-printable',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${'=\r\n'.repeat(80_000)}${plea}`, 'quoted-printable'),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '250 KB of trailing white space in quoted-printable',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${plea}${' '.repeat(250 * 1024)}x`, 'quoted-printable'),
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'quoted-printable with bad escapes',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `=ZZ =4 = ${plea} =`, 'quoted-printable'),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'an unknown charset with 8-bit letters',
    channel: 'mail',
    build: () => typed('text/plain; charset=x-nowhere', `${plea} ${latin1('Zähler')}`),
    defects: ['charset-unknown'],
    keeps: 'Zähler',
    expectedDecision: 'by-words',
  },
  {
    name: 'Latin-1 that claims to be UTF-8',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${plea} Z\xe4hler`),
    defects: ['charset-damaged'],
    keeps: 'Zähler',
    expectedDecision: 'by-words',
  },
  {
    name: 'Latin-1 without any label',
    channel: 'mail',
    build: () => mail(`${address}Subject: Question\r\n`, `${plea} Z\xe4hler`),
    defects: ['charset-undeclared'],
    keeps: 'Zähler',
    expectedDecision: 'by-words',
  },
  {
    name: 'KOI8-R without label, the subject says it',
    channel: 'mail',
    // "вода" in KOI8-R is D7 CF C4 C1.
    build: () => mail(`${address}Subject: =?koi8-r?B?18/EwQ==?=\r\n`, `${plea} \xd7\xcf\xc4\xc1`),
    defects: ['charset-undeclared'],
    keeps: 'вода',
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'вода' ? null : `subject ${subject}`),
  },
  {
    name: 'UTF-8 with a broken character among good ones',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${plea} ${latin1('Zähler für Köln')} \xc3`),
    defects: ['charset-damaged'],
    keeps: 'Zähler für Köln',
    expectedDecision: 'by-words',
  },
  {
    name: 'overlong UTF-8',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${plea} \xc0\xaf\xe0\x80\xaf`),
    defects: ['charset-damaged'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'surrogates written in UTF-8',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-8', `${plea} \xed\xa0\x80\xed\xb0\x80`),
    defects: ['charset-damaged'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a body in UTF-7',
    channel: 'mail',
    build: () => typed('text/html; charset=utf-7', `<p>${plea}</p>+ADw-b+AD4-`),
    defects: ['charset-unknown'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ text }) => (text.includes('<') ? 'UTF-7 was decoded' : null),
  },
  {
    name: 'UTF-16 without a byte order mark',
    channel: 'mail',
    build: () => typed('text/plain; charset=utf-16le', base64(Buffer.from(plea, 'utf16le')), 'base64'),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'UTF-16 of an odd number of bytes',
    channel: 'mail',
    build: () =>
      typed(
        'text/plain; charset=utf-16le',
        base64(Buffer.concat([Buffer.from(plea, 'utf16le'), Buffer.of(0x61)])),
        'base64',
      ),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '80,000 escape sequences of ISO-2022-JP',
    channel: 'mail',
    build: () => typed('text/plain; charset=iso-2022-jp', `${plea}${'\x1b$B\x1b(B'.repeat(40_000)}`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'GB18030 that breaks off',
    channel: 'mail',
    // "水" is CB AE.
    build: () => typed('text/plain; charset=gb18030', `${plea} \xcb\xae \x81\x30`),
    defects: [],
    keeps: '水',
    expectedDecision: 'by-words',
  },
  {
    name: 'a charset name of 10 KB',
    channel: 'mail',
    build: () => typed(`text/plain; charset=${'x'.repeat(10_000)}`, `${plea} ${latin1('ä')}`),
    defects: ['charset-unknown'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a charset named base64',
    channel: 'mail',
    build: () => typed('text/plain; charset=base64', `${plea} ${latin1('ä')}`),
    defects: ['charset-unknown'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a byte order mark before the header',
    channel: 'mail',
    build: () => Buffer.concat([Buffer.of(0xef, 0xbb, 0xbf), typed('text/plain; charset=utf-8', plea)]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ from }) => (from?.address === 'anna@berg.example' ? null : 'sender lost'),
  },
  {
    name: 'HTML that declares its charset only inside',
    channel: 'mail',
    // "ż" is BF in ISO 8859-2.
    build: () => typed('text/html', `<html><head><meta charset="iso-8859-2"></head><p>${plea} wy\xbfszy</p>`),
    defects: [],
    isExact: true,
    keeps: 'wyższy',
    expectedDecision: 'by-words',
  },
  {
    name: 'format=flowed, 250 KB of soft breaks',
    channel: 'mail',
    build: () =>
      typed('text/plain; charset=utf-8; format=flowed; delsp=yes', `${plea}\r\n${' \r\n'.repeat(80_000)}`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'format=flowed, 64,000 quotation marks deep',
    channel: 'mail',
    build: () =>
      typed(
        'text/plain; charset=utf-8; format=flowed',
        `${plea}\r\n${'>'.repeat(64_000)} \r\n${'>'.repeat(64_000)}`,
      ),
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a binary file labelled as text',
    channel: 'mail',
    build: () =>
      typed(
        'text/plain; charset=utf-8',
        base64(Buffer.from(Array.from({ length: 5000 }, (_, i) => i % 7))),
        'base64',
      ),
    defects: ['text-unreadable', 'text-missing'],
    expectedDecision: 'unreadable',
  },
];
