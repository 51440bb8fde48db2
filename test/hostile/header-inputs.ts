import { Buffer } from 'node:buffer';
import { address, form, type HostileInput, mail, plain, plea, streamOf } from './hostile-input.ts';

const withHeader = (header: string, body = plea) =>
  mail(`${header}\r\nMIME-Version: 1.0\r\nContent-Type: text/plain; charset=utf-8\r\n`, body);

/** Headers that are missing, huge, repeated, injected or made to be slow. */
export const headerInputs: readonly HostileInput[] = [
  {
    name: 'no header, only text',
    channel: 'mail',
    build: () => Buffer.from(`${plea}\r\nThank you.\r\n`),
    defects: ['header-missing', 'from-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a blank first line',
    channel: 'mail',
    build: () => Buffer.concat([Buffer.from('\r\n'), plain(plea)]),
    defects: ['blank-lines-first'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ from }) => (from?.address === 'anna@berg.example' ? null : 'sender lost'),
  },
  {
    name: 'an empty header and a body that looks like a field',
    channel: 'mail',
    build: () => Buffer.from(`\r\nNote: ${plea}\r\n`),
    defects: ['header-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'no blank line before the body',
    channel: 'mail',
    build: () => Buffer.from(`${address}Subject: Question\r\n${plea}\r\nThank you.\r\n`),
    defects: ['header-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a line in the header that is no field',
    channel: 'mail',
    build: () => withHeader(`${address}this is no field\r\nSubject: Question`),
    defects: ['header-line-unreadable'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'Question' ? null : 'subject lost'),
  },
  {
    name: 'the envelope line of a mailbox in front',
    channel: 'mail',
    build: () =>
      Buffer.concat([Buffer.from('From anna@berg.example Tue Mar  3 10:15:00 2026\r\n'), plain(plea)]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a header that never ends',
    channel: 'mail',
    build: () => streamOf(`${address}Subject: Question\r\n`, 'X-Filler: water\r\n', 5 * 1024 * 1024),
    defects: ['text-missing'],
    expectedDecision: 'by-words',
  },
  {
    name: '100,000 header fields before the subject',
    channel: 'mail',
    build: () => streamOf(address, 'X-Filler: water\r\n', 1_700_000, `Subject: Question\r\n\r\n${plea}`),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'Question' ? null : 'subject lost'),
  },
  {
    name: 'a subject of 10 MB',
    channel: 'mail',
    build: () => streamOf(`${address}Subject: `, 'water ', 10 * 1024 * 1024, `\r\n\r\n${plea}`),
    defects: ['header-cut', 'subject-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject.length <= 998 ? null : 'subject too long'),
  },
  {
    name: 'a subject folded over 100,000 lines',
    channel: 'mail',
    build: () => streamOf(`${address}Subject: Question`, '\r\n water', 800_000, `\r\n\r\n${plea}`),
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a subject of 60 KB of white space',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: a${' '.repeat(60_000)}b`),
    defects: ['subject-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a subject of 60 KB of encoded words',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: ${'=?utf-8?B?d2F0ZXI=?= '.repeat(2900)}`),
    defects: ['subject-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a subject of 60 KB of encoded words without spaces',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: ${'=?utf-8?Q?w?='.repeat(4700)}`),
    defects: ['subject-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a subject of beginnings of encoded words',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: ${'=?utf-8?Q?'.repeat(800)}`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'an encoded word of an unknown charset',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: =?x-nowhere?Q?Question?=`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'Question' ? null : `subject ${subject}`),
  },
  {
    name: 'an encoded word in UTF-7',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: =?utf-7?Q?+ADw-script+AD4-?=`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject.includes('<') ? 'UTF-7 was decoded' : null),
  },
  {
    name: 'an encoded word that brings a header of its own',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: =?utf-8?Q?Question=0D=0Ax-amz-meta-tallypost-queue:_leaks?=`),
    defects: ['line-break-in-header'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (/[\r\n]/.test(subject) ? 'line break kept' : null),
  },
  {
    name: 'NUL and escape characters in the subject',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: Quest\0ion \x1b[2J now`),
    defects: ['control-characters'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'Question [2J now' ? null : `subject ${JSON.stringify(subject)}`),
  },
  {
    name: 'two subjects, two senders, two dates',
    channel: 'mail',
    build: () =>
      withHeader(
        `${address}Subject: Question\r\nSubject: Emergency\r\nFrom: boss@bank.example\r\nDate: Tue, 3 Mar 2026 10:15:00 +0000\r\nDate: Tue, 3 Mar 2020 10:15:00 +0000`,
      ),
    defects: ['header-repeated'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject, from, sentAtMs }) =>
      subject === 'Question' &&
      from?.address === 'anna@berg.example' &&
      sentAtMs === Date.UTC(2026, 2, 3, 10, 15)
        ? null
        : 'not the first',
  },
  {
    name: 'two content types with different boundaries',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: multipart/mixed; boundary=a\r\nContent-Type: multipart/mixed; boundary=b\r\n`,
        `--a\r\n\r\n${plea}\r\n--b\r\n\r\nother\r\n--a--\r\n`,
      ),
    defects: ['header-repeated'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '10,000 recipients in one field',
    channel: 'mail',
    build: () => {
      const list = Array.from({ length: 10_000 }, (_, i) => `Person ${i} <p${i}@list.example>`).join(
        ',\r\n ',
      );
      return withHeader(
        `From: anna@berg.example\r\nTo: contact@fenmarkwater.example, ${list}\r\nSubject: Question`,
      );
    },
    defects: ['header-cut', 'recipients-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ recipients }) =>
      recipients.length === 100 && recipients[0]!.address === 'contact@fenmarkwater.example'
        ? null
        : 'recipients wrong',
  },
  {
    name: '10,000 recipients in as many fields',
    channel: 'mail',
    build: () => {
      const list = Array.from({ length: 10_000 }, (_, i) => `To: p${i}@list.example`).join('\r\n');
      return withHeader(`${address}Subject: Question\r\n${list}`);
    },
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ recipients }) => (recipients.length === 20 ? null : `${recipients.length} recipients`),
  },
  {
    name: '20 fields of recipients, 50 KB each',
    channel: 'mail',
    build: () =>
      withHeader(
        `${address}Subject: Question\r\n${`Cc: ${'<a@b.example>, '.repeat(3500)}\r\n`.repeat(20).trimEnd()}`,
      ),
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '1 MB of references',
    channel: 'mail',
    build: () =>
      streamOf(
        `${address}Subject: Question\r\nReferences:`,
        ' <a@b.example>\r\n',
        1024 * 1024,
        `\r\n${plea}`,
      ),
    defects: ['header-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ facts }) => (facts.isReply ? null : 'reply not seen'),
  },
  {
    name: '60 KB of open comments in the sender',
    channel: 'mail',
    build: () => withHeader(`From: ${'('.repeat(60_000)}anna@berg.example\r\nSubject: Question`),
    defects: ['address-unreadable', 'from-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '60 KB of open quotes and brackets in the recipients',
    channel: 'mail',
    build: () => withHeader(`From: anna@berg.example\r\nTo: ${'"<'.repeat(30_000)}\r\nSubject: Question`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '60 KB of groups inside groups',
    channel: 'mail',
    build: () =>
      withHeader(`From: anna@berg.example\r\nTo: ${'g:'.repeat(30_000)}a@b.example\r\nSubject: Question`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '60 KB of white space in the recipients',
    channel: 'mail',
    build: () =>
      withHeader(
        `From: anna@berg.example\r\nTo: a${' '.repeat(60_000)}.b@c.example (x)\r\nSubject: Question`,
      ),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a sender address of 10 KB',
    channel: 'mail',
    build: () => withHeader(`From: <${'a'.repeat(10_000)}@b.example>\r\nSubject: Question`),
    defects: ['address-unreadable', 'from-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a display name that looks like another address',
    channel: 'mail',
    build: () => withHeader('From: "contact@fenmarkwater.example" <anna@berg.example>\r\nSubject: Question'),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ from }) => (from?.address === 'anna@berg.example' ? null : 'wrong sender'),
  },
  {
    name: 'a sender domain in letters that look Latin',
    channel: 'mail',
    // U+0435, Cyrillic IE: "f\u0435nmarkwater.example" is xn--... in ASCII.
    build: () =>
      withHeader(
        `From: <help@${Buffer.from('f\u0435nmarkwater.example').toString('latin1')}>\r\nSubject: Question`,
      ),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ from }) => (from?.domain.startsWith('xn--') ? null : `domain ${from?.domain}`),
  },
  {
    name: 'a message id of control characters and brackets',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: Question\r\nMessage-ID: <<\x01a b\x02@c>>`),
    defects: ['control-characters'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a date that is none',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: Question\r\nDate: Yesterday, 99 Foo 20000 99:99:99 +9999`),
    defects: ['date-unreadable'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ sentAtMs }) => (sentAtMs === null ? null : 'a date was made up'),
  },
  {
    name: 'a date of 60 KB of open comments',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: Question\r\nDate: ${'('.repeat(60_000)}`),
    defects: ['date-unreadable'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a content type of 60 KB of open comments',
    channel: 'mail',
    build: () =>
      mail(`${address}Subject: Question\r\nContent-Type: text/plain ${'('.repeat(60_000)}\r\n`, plea),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a content type of 60 KB of parameters',
    channel: 'mail',
    build: () =>
      mail(`${address}Subject: Question\r\nContent-Type: text/plain${'; a="b"'.repeat(8000)}\r\n`, plea),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a content type of quotes and backslashes',
    channel: 'mail',
    build: () =>
      mail(`${address}Subject: Question\r\nContent-Type: text/plain; a="${'\\"'.repeat(30_000)}\r\n`, plea),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a content type that is no type',
    channel: 'mail',
    build: () => mail(`${address}Subject: Question\r\nContent-Type: \\;;;=;/\r\n`, plea),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'parameters named like object members',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: text/plain; __proto__=x; constructor=y; charset=__proto__\r\n`,
        plea,
      ),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'fields named like object members',
    channel: 'mail',
    build: () => withHeader(`${address}__proto__: x\r\nconstructor: y\r\ntoString: z\r\nSubject: Question`),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: '150 Received fields: mail that goes round',
    channel: 'mail',
    build: () =>
      withHeader(
        `${'Received: from a by b; Tue, 3 Mar 2026 10:15:00 +0000\r\n'.repeat(150)}${address}Subject: Question`,
      ),
    defects: ['loop-suspected'],
    keeps: plea,
    expectedDecision: 'automatic',
  },
  {
    name: 'raw 8-bit letters in the subject',
    channel: 'mail',
    build: () => withHeader(`${address}Subject: Z\xe4hler`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'Zähler' ? null : `subject ${subject}`),
  },
  {
    name: 'a direction override in the subject',
    channel: 'mail',
    build: () =>
      withHeader(`${address}Subject: ${Buffer.from('pay \u202ellib ym\u202c now').toString('latin1')}`),
    defects: ['direction-override'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ subject }) => (subject === 'pay llib ym now' ? null : `subject ${JSON.stringify(subject)}`),
  },
  {
    name: 'a form whose field name brings a header',
    channel: 'form',
    build: () =>
      form({ form: 'contact', fields: { 'topic\r\nx-amz-meta-tallypost-queue': 'leaks', message: plea } }),
    defects: ['line-break-in-header'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ form: f }) =>
      Object.keys(f!.fields).some((name) => /[\r\n]/.test(name)) ? 'line break kept' : null,
  },
];
