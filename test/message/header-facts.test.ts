import { describe, expect, test } from 'vitest';
import { parseWire } from './mail-source.ts';

const factsOf = async (header: string) =>
  (await parseWire(`${header}From: a@b.example\nSubject: x\n\ntext\n`)).facts;

describe('automatic mail (RFC 3834 section 5, RFC 5321 section 4.5.5)', () => {
  const cases: [header: string, isAutomatic: boolean][] = [
    ['', false],
    ['Auto-Submitted: no\n', false],
    ['Auto-Submitted: No (a person wrote this)\n', false],
    ['Auto-Submitted: auto-generated\n', true],
    ['Auto-Submitted: auto-replied\n', true],
    ['Auto-Submitted: auto-replied (vacation)\n', true],
    ['auto-submitted: AUTO-NOTIFIED; owner-email="joe@example.com"\n', true],
    // Section 5 lets keywords be added; anything but `no` is automatic.
    ['Auto-Submitted: auto-something-new\n', true],
    ['Return-Path: <>\n', true],
    ['Return-Path: < >\n', true],
    ['Return-Path: <a@b.example>\n', false],
  ];
  test.each(cases)('%j: %s', async (header, isAutomatic) => {
    expect((await factsOf(header)).isAutomatic).toBe(isAutomatic);
  });
});

describe('list mail (RFC 2919 section 3, its examples)', () => {
  const examples = [
    'List Header Mailing List <list-header.nisto.com>',
    '<commonspace-users.list-id.within.com>',
    '"Lena\'s Personal Joke List "\n         <lenas-jokes.da39efc25c530ad145d41b86f7420c3b.021999.localhost>',
    '"An internal CMU List" <0Jks9449.list-id.cmu.edu>',
    '<da39efc25c530ad145d41b86f7420c3b.052000.localhost>',
  ];
  test.each(examples)('List-Id: %s', async (value) => {
    expect((await factsOf(`List-Id: ${value}\n`)).isList).toBe(true);
  });

  test('an empty List-Id is none', async () => {
    expect((await factsOf('List-Id: \n')).isList).toBe(false);
    expect((await factsOf('')).isList).toBe(false);
  });
});

describe('replies (RFC 5322 section 3.6.4)', () => {
  test.each([
    ['In-Reply-To: <1@a.example>\n', true],
    ['References: <1@a.example> <2@a.example>\n', true],
    ['In-Reply-To:\n', false],
    ['', false],
  ])('%j: %s', async (header, isReply) => {
    expect((await factsOf(header)).isReply).toBe(isReply);
  });
});

describe('verdicts of the receiving service', () => {
  test.each([
    ['X-SES-Spam-Verdict: PASS\n', 'pass', 'missing'],
    ['X-SES-Spam-Verdict: FAIL\nX-SES-Virus-Verdict: PASS\n', 'fail', 'pass'],
    ['X-SES-Spam-Verdict: GRAY\nX-SES-Virus-Verdict: PROCESSING_FAILED\n', 'gray', 'failed'],
    ['X-SES-Spam-Verdict: anything\n', 'missing', 'missing'],
    // The service writes on top; a second field came with the mail.
    ['X-SES-Spam-Verdict: FAIL\nX-SES-Spam-Verdict: PASS\n', 'fail', 'missing'],
  ])('%j', async (header, spam, virus) => {
    const facts = await factsOf(header);
    expect([facts.spam, facts.virus]).toEqual([spam, virus]);
  });
});

describe('delivery reports (RFC 3464 appendix E.1)', () => {
  const report = `
Date: Thu, 7 Jul 1994 17:16:05 -0400
From: Mail Delivery Subsystem <MAILER-DAEMON@CS.UTK.EDU>
Message-Id: <199407072116.RAA14128@CS.UTK.EDU>
Subject: Returned mail: Cannot send message for 5 days
To: <owner-info-mime@cs.utk.edu>
MIME-Version: 1.0
Content-Type: multipart/report; report-type=delivery-status;
      boundary="RAA14128.773615765/CS.UTK.EDU"

--RAA14128.773615765/CS.UTK.EDU

The original message was received at Sat, 2 Jul 1994 17:10:28 -0400
from root@localhost

   ----- The following addresses had delivery problems -----
<louisl@larry.slip.umd.edu>  (unrecoverable error)

----- Transcript of session follows -----
<louisl@larry.slip.umd.edu>... Deferred: Connection timed out
      with larry.slip.umd.edu.
Message could not be delivered for 5 days
Message will be deleted from queue

--RAA14128.773615765/CS.UTK.EDU
content-type: message/delivery-status

Reporting-MTA: dns; cs.utk.edu

Original-Recipient: rfc822;louisl@larry.slip.umd.edu
Final-Recipient: rfc822;louisl@larry.slip.umd.edu
Action: failed
Status: 4.0.0
Diagnostic-Code: smtp; 426 connection timed out
Last-Attempt-Date: Thu, 7 Jul 1994 17:15:49 -0400

--RAA14128.773615765/CS.UTK.EDU
content-type: message/rfc822

[original message goes here]

--RAA14128.773615765/CS.UTK.EDU--
`;
  test('is known as a report, with its explanation and its status fields as text', async () => {
    const message = await parseWire(report);
    expect(message.facts.isDeliveryReport).toBe(true);
    expect(message.from?.address).toBe('mailer-daemon@cs.utk.edu');
    expect(message.text).toContain('Message could not be delivered for 5 days');
    expect(message.text).toContain('Final-Recipient: rfc822;louisl@larry.slip.umd.edu');
    expect(message.text).toContain('Status: 4.0.0');
    // 17:16:05 at -0400 is 21:16:05 UTC.
    expect(message.sentAtMs).toBe(Date.UTC(1994, 6, 7, 21, 16, 5));
  });

  test('the original message counts as text, not as own words', async () => {
    const message = await parseWire(report);
    expect(message.text).toContain('[original message goes here]');
    expect(message.ownText).not.toContain('[original message goes here]');
    expect(message.attachments.map(({ kind }) => kind)).toEqual(['message']);
  });

  test('another report is none about delivery', async () => {
    const message = await parseWire(report.replace('delivery-status;', 'disposition-notification;'));
    expect(message.facts.isDeliveryReport).toBe(false);
  });
});
