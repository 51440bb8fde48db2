import { Buffer } from 'node:buffer';
import { describe, expect, test } from 'vitest';
import { parseMail } from '../../src/message/mail.ts';
import { codesOf, inPieces, plainMail, wire } from './mail-source.ts';

const letter = wire(`
Return-Path: <anna@berg.example>
From: Anna Berg <Anna@Berg.Example>
To: help@fenmarkwater.example
Cc: Help <HELP@fenmarkwater.example>, other@fenmarkwater.example
Delivered-To: bills@fenmarkwater.example
Subject: =?utf-8?Q?Z=C3=A4hler?=
 defekt
Date: Tue, 3 Mar 2026 10:15:00 +0100
Message-ID: <1@berg.example>
MIME-Version: 1.0
Content-Type: multipart/mixed; boundary=outer

--outer
Content-Type: multipart/alternative; boundary=inner

--inner
Content-Type: text/plain; charset=utf-8
Content-Transfer-Encoding: quoted-printable

Der Z=C3=A4hler ist kaputt, bitte tauschen Sie ihn aus.
--inner
Content-Type: text/html; charset=utf-8

<p>Der Zähler ist kaputt, bitte tauschen Sie ihn aus.</p>
--inner--
--outer
Content-Type: image/jpeg; name="meter.jpg"
Content-Disposition: attachment; filename="meter.jpg"
Content-Transfer-Encoding: base64

/9j/4AAQ
--outer--
`);

describe('parseMail', () => {
  test('gives the whole message', async () => {
    expect(await parseMail(letter)).toEqual({
      channel: 'mail',
      messageId: '1@berg.example',
      from: { address: 'anna@berg.example', domain: 'berg.example' },
      // Each address once: Cc repeats To in capitals.
      recipients: [
        { address: 'help@fenmarkwater.example', domain: 'fenmarkwater.example' },
        { address: 'other@fenmarkwater.example', domain: 'fenmarkwater.example' },
        { address: 'bills@fenmarkwater.example', domain: 'fenmarkwater.example' },
      ],
      subject: 'Zähler defekt',
      text: 'Der Zähler ist kaputt, bitte tauschen Sie ihn aus.',
      ownText: 'Der Zähler ist kaputt, bitte tauschen Sie ihn aus.',
      attachments: [{ kind: 'image', bytes: 8 }],
      facts: {
        isReply: false,
        isAutomatic: false,
        isList: false,
        isDeliveryReport: false,
        spam: 'missing',
        virus: 'missing',
      },
      // 10:15 at +0100 is 09:15 UTC.
      sentAtMs: Date.UTC(2026, 2, 3, 9, 15),
      form: null,
      defects: [],
    });
  });

  test.each([1, 2, 3, 7, 64, 1000])('gives the same from a stream in pieces of %i bytes', async (size) => {
    expect(await parseMail(inPieces(letter, size))).toEqual(await parseMail(letter));
  });

  const lineEnds: [what: string, source: string, codes: string[]][] = [
    ['CRLF', 'From: a@b.example\r\nSubject: Question\r\n\r\nOne.\r\nTwo.\r\n', []],
    ['LF', 'From: a@b.example\nSubject: Question\n\nOne.\nTwo.\n', []],
    ['CR', 'From: a@b.example\rSubject: Question\r\rOne.\rTwo.\r', ['line-ends-bare-cr']],
    ['CR CR LF', 'From: a@b.example\r\r\nSubject: Question\r\r\n\r\r\nOne.\r\nTwo.\r\n', []],
    ['CRLF, then CR', 'From: a@b.example\r\nSubject: Question\r\n\r\nOne.\rTwo.', []],
    ['CRLF after a byte order mark', '\ufeffFrom: a@b.example\r\nSubject: Question\r\n\r\nOne.\r\nTwo.', []],
  ];
  test.each(lineEnds)('lines that end in %s, however they are cut', async (_what, source, codes) => {
    const raw = Buffer.from(source);
    for (const size of [1, 2, 3, 18, 19, 20, 1000]) {
      const message = await parseMail(inPieces(raw, size));
      expect([message.from?.address, message.subject, message.text]).toEqual([
        'a@b.example',
        'Question',
        'One.\nTwo.',
      ]);
      expect(codesOf(message)).toEqual(codes);
    }
  });

  test('keeps nothing of one message for the next', async () => {
    const alone = await parseMail(plainMail('The water is brown.'));
    const [first, second] = await Promise.all([
      parseMail(plainMail('The water is brown.')),
      parseMail(plainMail('Another meter.')),
    ]);
    expect(first).toEqual(alone);
    expect(second.text).toBe('Another meter.');
  });

  test('stops at the deadline and keeps what it has', async () => {
    // A clock of the test: every look at it takes 2 s, so that two pieces of work use up the 5 s.
    let nowMs = 0;
    const head = 'From: a@b.example\r\nSubject: Question\r\n\r\nThe water is brown. ';
    const endless = inPieces(Buffer.from(head + 'More. '.repeat(100_000)), 16 * 1024);
    const message = await parseMail(endless, {
      nowMs: () => {
        nowMs += 2000;
        return nowMs;
      },
    });
    expect(codesOf(message)).toContain('time-cut');
    expect(message.subject).toBe('Question');
    expect(message.text).toMatch(/^The water is brown\. More\./);
  });

  test('waiting for the source does not count towards the deadline', async () => {
    let nowMs = 0;
    const slowSource = (async function* () {
      for await (const piece of inPieces(letter, 200)) {
        nowMs += 60_000;
        yield piece;
      }
    })();
    const message = await parseMail(slowSource, { nowMs: () => nowMs });
    expect(message.defects).toEqual([]);
  });

  test('closes the source when it stops early', async () => {
    let isClosed = false;
    const source = (async function* () {
      try {
        for (;;) yield Buffer.from('From: a@b.example\r\n\r\n'.padEnd(1024 * 1024, 'x'));
      } finally {
        isClosed = true;
      }
    })();
    expect(codesOf(await parseMail(source))).toContain('raw-cut');
    expect(isClosed).toBe(true);
  });

  test('text in the header of a part, its blank line forgotten, counts as text', async () => {
    const message = await parseMail(
      wire(
        'From: a@b.example\nContent-Type: multipart/mixed; boundary=b\n\n--b\nContent-Type: text/plain\nThe water is brown.\n\n--b\nContent-Type: text/html\n<p>Please come.</p>\n--b--\n',
      ),
    );
    expect(message.text).toBe('The water is brown.\n\nPlease come.');
    expect(codesOf(message)).toEqual(['header-missing', 'header-missing']);
  });

  const subjects: [source: string, subject: string][] = [
    ['Subject: plain', 'plain'],
    ['Subject:  two   spaces\tand a tab ', 'two spaces and a tab'],
    ['Subject:\n folded\n\tthrice', 'folded thrice'],
    ['SUBJECT: capitals', 'capitals'],
    ['X-Other: a', ''],
    ['Subject:', ''],
    ['Subject: =?UTF-8?B?4oKsIDEwLC0=?=', '€ 10,-'],
    ['Subject: =?utf-8*de?Q?Z=C3=A4hler?=', 'Zähler'],
    // A character cut in two by words that were split inside it.
    ['Subject: =?utf-8?B?WsO=?= =?utf-8?B?pGhsZXI=?=', 'Zähler'],
    ['Subject: =?utf-8?Q?half', '=?utf-8?Q?half'],
  ];
  test.each(subjects)('%j has the subject %j', async (source, subject) => {
    expect((await parseMail(wire(`From: a@b.example\n${source}\n\ntext\n`))).subject).toBe(subject);
  });
});
