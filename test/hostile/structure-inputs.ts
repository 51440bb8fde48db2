import { Buffer } from 'node:buffer';
import {
  address,
  type HostileInput,
  html,
  htmlPart,
  mail,
  multipart,
  plain,
  plea,
  randomIntegers,
  streamOf,
  textPart,
} from './hostile-input.ts';

const mixedHead = `${address}Subject: Question\r\nContent-Type: multipart/mixed; boundary=b\r\n\r\n--b\r\n${textPart(plea)}\r\n`;
const attachmentHead =
  '--b\r\nContent-Type: application/pdf; name=a.pdf\r\nContent-Transfer-Encoding: base64\r\n\r\n';
const base64Line = `${'QUJD'.repeat(19)}\r\n`;

function nested(depth: number, core: string): string {
  let body = core;
  for (let level = depth; level > 0; level--) {
    body = `Content-Type: multipart/mixed; boundary=n${level}\r\n\r\n--n${level}\r\n${body}\r\n--n${level}--\r\n`;
  }
  return body;
}

/** Sizes, depths and counts; missing, wrong and hostile boundaries. */
export const structureInputs: readonly HostileInput[] = [
  {
    name: 'no bytes at all',
    channel: 'mail',
    build: () => new Uint8Array(0),
    defects: ['message-empty', 'text-missing'],
    expectedDecision: 'unreadable',
  },
  {
    name: 'only line ends',
    channel: 'mail',
    build: () => Buffer.from('\r\n\r\n\r\n'),
    defects: ['blank-lines-first', 'text-missing'],
    expectedDecision: 'by-words',
  },
  {
    name: '25 MB of line feeds',
    channel: 'mail',
    build: () => streamOf('', '\n', 25 * 1024 * 1024),
    defects: ['blank-lines-first', 'text-missing'],
    expectedDecision: 'by-words',
  },
  {
    name: '25 MB of line feeds as body',
    channel: 'mail',
    build: () => streamOf(`${address}Subject: Question\r\n\r\n`, '\n', 25 * 1024 * 1024, plea),
    defects: ['text-cut'],
    expectedDecision: 'by-words',
  },
  {
    name: '25 MB of line feeds inside a multipart',
    channel: 'mail',
    build: () => streamOf(mixedHead, '\n', 25 * 1024 * 1024),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '1 MB of NUL bytes',
    channel: 'mail',
    build: () => streamOf('', '\0', 1024 * 1024),
    defects: ['text-unreadable'],
    expectedDecision: 'unreadable',
  },
  {
    name: '1 MB of random bytes',
    channel: 'mail',
    build: () => {
      const next = randomIntegers(7);
      return Buffer.from(Array.from({ length: 1024 * 1024 }, () => next() & 0xff));
    },
    defects: ['text-unreadable'],
    expectedDecision: 'unreadable',
  },
  {
    name: 'a picture instead of a message',
    channel: 'mail',
    build: () =>
      Buffer.concat([Buffer.from('89504e470d0a1a0a0000000d49484452', 'hex'), Buffer.alloc(5000, 1)]),
    defects: ['header-missing'],
    expectedDecision: 'unreadable',
  },
  {
    name: 'a 25 MB attachment',
    channel: 'mail',
    build: () => streamOf(mixedHead + attachmentHead, base64Line, 25 * 1024 * 1024, '\r\n--b--\r\n'),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ attachments }) =>
      attachments.length === 1 && attachments[0]!.bytes > 25_000_000 ? null : 'attachment size wrong',
  },
  {
    name: 'mail of 45 MB, more than the receiving service takes',
    channel: 'mail',
    build: () => streamOf(mixedHead + attachmentHead, base64Line, 45 * 1024 * 1024, '\r\n--b--\r\n'),
    defects: ['raw-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '900 multiparts deep with 20 MB of dashes',
    channel: 'mail',
    build: () =>
      streamOf(`${address}Subject: Question\r\n${nested(900, textPart(plea))}`, '--\r\n', 20 * 1024 * 1024),
    defects: ['depth-cut'],
    expectedDecision: 'by-words',
  },
  {
    name: '19 multiparts deep with 20 MB of dashes',
    channel: 'mail',
    build: () => {
      const open = Array.from(
        { length: 19 },
        (_, level) => `Content-Type: multipart/mixed; boundary=n${level}\r\n\r\n--n${level}\r\n`,
      ).join('');
      return streamOf(
        `${address}Subject: Question\r\n${open}${textPart(plea)}\r\n`,
        '--\r\n',
        20 * 1024 * 1024,
      );
    },
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '20 multiparts deep, as deep as is read',
    channel: 'mail',
    build: () => mail(`${address}Subject: Question`, nested(20, textPart(plea))),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '21 multiparts deep',
    channel: 'mail',
    build: () => mail(`${address}Subject: Question`, nested(21, textPart(plea))),
    defects: ['depth-cut'],
    expectedDecision: 'by-words',
  },
  {
    name: '100 messages inside each other',
    channel: 'mail',
    build: () => {
      let inner = `${address}Subject: innermost\r\n\r\n${plea}`;
      for (let i = 0; i < 100; i++) inner = `${address}Content-Type: message/rfc822\r\n\r\n${inner}`;
      return Buffer.from(inner, 'latin1');
    },
    defects: ['depth-cut'],
    expectedDecision: 'by-words',
  },
  {
    name: '1,000 parts',
    channel: 'mail',
    build: () => multipart('mixed', [textPart(plea), ...Array.from({ length: 999 }, () => textPart('more'))]),
    defects: ['parts-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '98 parts, each with a subject of 240 KB of encoded words',
    channel: 'mail',
    build: async function* () {
      const subject = '=?utf-8?B?d2F0ZXI=?= '.repeat(11_700);
      yield Buffer.from(mixedHead, 'latin1');
      for (let i = 0; i < 98; i++)
        yield Buffer.from(`--b\r\nSubject: ${subject}\r\n${textPart('more')}\r\n`, 'latin1');
    },
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a part with a header of 300 KB',
    channel: 'mail',
    build: () =>
      multipart('mixed', [textPart(plea), `X-Long: ${'a'.repeat(300 * 1024)}\r\n${textPart('more')}`]),
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '98 parts, each with a file name of 6 KB of encoded words',
    channel: 'mail',
    build: () => {
      const name = '=?utf-8?Q?=C3=A4?= '.repeat(340);
      const part = `Content-Type: application/pdf\r\nContent-Disposition: attachment; filename="${name}"\r\n\r\nx`;
      return multipart('mixed', [textPart(plea), ...Array.from({ length: 98 }, () => part)]);
    },
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a file name in 5,000 pieces (RFC 2231)',
    channel: 'mail',
    build: () => {
      const pieces = Array.from({ length: 5000 }, (_, i) => `;\r\n filename*${i}*=%C3%A4`).join('');
      return multipart('mixed', [
        textPart(plea),
        `Content-Type: application/pdf\r\nContent-Disposition: attachment${pieces}\r\n\r\nx`,
      ]);
    },
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'multipart without a boundary parameter',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: multipart/mixed\r\n`,
        `--b\r\n${textPart(plea)}\r\n--b--\r\n`,
      ),
    defects: ['boundary-guessed'],
    keeps: plea,
    drops: 'charset',
    expectedDecision: 'by-words',
  },
  {
    name: 'multipart with another boundary than it says',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: multipart/alternative; boundary=said\r\n`,
        `--used\r\n${textPart(plea)}\r\n--used\r\n${htmlPart(`<p>${plea}</p>`)}\r\n--used--\r\n`,
      ),
    defects: ['boundary-guessed'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'multipart without any boundary line',
    channel: 'mail',
    build: () => mail(`${address}Subject: Question\r\nContent-Type: multipart/mixed; boundary=b\r\n`, plea),
    defects: ['boundary-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'multipart without any boundary line and 300 KB of text',
    channel: 'mail',
    build: () =>
      streamOf(
        `${address}Subject: Question\r\nContent-Type: multipart/mixed; boundary=b\r\n\r\n${plea}`,
        ' water',
        300 * 1024,
      ),
    defects: ['boundary-missing', 'text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '98 parts, each with something wrong',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        textPart(plea),
        ...Array.from({ length: 98 }, () => 'Content-Type: text/plain; charset=x-nowhere\r\n\r\n\xe4'),
      ]),
    defects: ['charset-unknown', 'defects-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ defects }) => (defects.length === 50 ? null : `${defects.length} defects`),
  },
  {
    name: 'multipart without body',
    channel: 'mail',
    build: () => mail(`${address}Subject: Question\r\nContent-Type: multipart/mixed; boundary=b\r\n`, ''),
    defects: ['text-missing'],
    expectedDecision: 'by-words',
  },
  {
    name: 'an empty boundary',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: multipart/mixed; boundary=""\r\n`,
        `--\r\n${textPart(plea)}\r\n----\r\n`,
      ),
    defects: ['boundary-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a boundary of 10,000 characters',
    channel: 'mail',
    build: () => multipart('mixed', [textPart(plea)], 'b'.repeat(10_000)),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a boundary that begins like the outer one',
    channel: 'mail',
    build: () =>
      multipart(
        'mixed',
        [
          `Content-Type: multipart/alternative; boundary=frontier2\r\n\r\n--frontier2\r\n${textPart(plea)}\r\n--frontier2--`,
          textPart('second'),
        ],
        'frontier',
      ),
    defects: [],
    isExact: true,
    keeps: `${plea}\n\nsecond`,
    expectedDecision: 'by-words',
  },
  {
    name: 'one boundary for two levels',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        `Content-Type: multipart/alternative; boundary=frontier\r\n\r\n--frontier\r\n${textPart(plea)}\r\n--frontier--`,
      ]),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a multipart that ends in the middle',
    channel: 'mail',
    build: () => Buffer.from(`${mixedHead}${attachmentHead}QUJDRE`, 'latin1'),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ attachments }) => (attachments[0]?.kind === 'pdf' ? null : 'attachment lost'),
  },
  {
    name: 'the text after the closing boundary',
    channel: 'mail',
    build: () =>
      Buffer.concat([multipart('mixed', [textPart(plea)]), Buffer.from(`--frontier\r\n${textPart('late')}`)]),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a part without the blank line after its header',
    channel: 'mail',
    build: () => multipart('mixed', [plea, textPart('second')]),
    defects: ['header-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '10,000 empty boundary lines',
    channel: 'mail',
    build: () => streamOf(mixedHead, '--b\r\n', 50_000),
    defects: ['parts-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'one line of 10 MB as body',
    channel: 'mail',
    build: () => streamOf(`${address}Subject: Question\r\n\r\n${plea} `, 'x', 10 * 1024 * 1024),
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'one line of 10 MB inside a multipart',
    channel: 'mail',
    build: () => streamOf(`${mixedHead}--b\r\nContent-Type: text/plain\r\n\r\n`, 'x', 10 * 1024 * 1024),
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a message sent one byte at a time',
    channel: 'mail',
    build: async function* () {
      for (const byte of multipart('mixed', [textPart(plea), htmlPart('<p>more</p>')]))
        yield Uint8Array.of(byte);
    },
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a source that fails midway',
    channel: 'mail',
    build: async function* () {
      yield plain(`${plea} and`);
      throw new Error('connection lost');
    },
    defects: ['source-failed'],
    keeps: plea,
    expectedDecision: 'unreadable',
  },
  {
    name: 'bare CR as line end',
    channel: 'mail',
    build: () => Buffer.from(`${address}Subject: Question\r\n\r\n${plea}`.replaceAll('\r\n', '\r')),
    defects: ['line-ends-bare-cr'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'LF in the header, CRLF in the body, CR CR LF between',
    channel: 'mail',
    build: () =>
      Buffer.from(`${address.replaceAll('\r', '')}Subject: Question\r\r\n\r\n${plea}\r\nmore\rlines`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a digest of 60 messages',
    channel: 'mail',
    build: () =>
      multipart(
        'digest',
        Array.from({ length: 60 }, (_, i) => `\r\nFrom: a@b.example\r\nSubject: ${i}\r\n\r\n${plea}`),
      ),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'HTML of 5 MB: <b>x</b> again and again',
    channel: 'mail',
    build: () =>
      streamOf(
        `${address}Subject: Question\r\nContent-Type: text/html\r\n\r\n<p>${plea}</p>`,
        '<b>x</b>',
        5 * 1024 * 1024,
      ),
    defects: ['html-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '500 KB of lists inside lists',
    channel: 'mail',
    build: () => html(`<p>${plea}</p>${'<ul><li>x'.repeat(55_000)}`),
    defects: ['html-depth-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '500 KB of tables inside tables',
    channel: 'mail',
    build: () => html(`<p>${plea}</p>${'<table><tr><td>x'.repeat(31_000)}`),
    defects: ['html-depth-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
];
