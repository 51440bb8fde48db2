import { Buffer } from 'node:buffer';
import {
  address,
  type HostileInput,
  htmlPart,
  mail,
  multipart,
  padding,
  plain,
  plea,
  textPart,
} from './hostile-input.ts';

const kindsAre =
  (...kinds: string[]): NonNullable<HostileInput['check']> =>
  ({ attachments }) =>
    attachments.map(({ kind }) => kind).join() === kinds.join()
      ? null
      : `kinds ${attachments.map(({ kind }) => kind)}`;

/** Kinds of mail that are not a letter from a person: containers, signatures, reports, automatic mail. */
export const kindInputs: readonly HostileInput[] = [
  {
    name: 'winmail.dat',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        textPart(plea),
        'Content-Type: application/ms-tnef; name=winmail.dat\r\nContent-Transfer-Encoding: base64\r\n\r\neJ8+Ig==',
      ]),
    defects: ['outlook-container'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: kindsAre('other'),
  },
  {
    name: 'nothing but winmail.dat',
    channel: 'mail',
    build: () =>
      mail(`${address}Subject: Question\r\nContent-Type: application/ms-tnef; name=winmail.dat\r\n`, 'x'),
    defects: ['outlook-container', 'text-missing'],
    expectedDecision: 'by-words',
  },
  {
    name: 'an invitation with a calendar part',
    channel: 'mail',
    build: () =>
      multipart('alternative', [
        textPart(plea),
        'Content-Type: text/calendar; method=REQUEST\r\n\r\nBEGIN:VCALENDAR\r\nSUMMARY:sewer flooding\r\nEND:VCALENDAR',
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
    check: kindsAre('calendar'),
  },
  {
    name: 'signed mail (S/MIME, detached)',
    channel: 'mail',
    build: () =>
      multipart('signed; protocol="application/pkcs7-signature"', [
        textPart(plea),
        'Content-Type: application/pkcs7-signature; name=smime.p7s\r\nContent-Transfer-Encoding: base64\r\n\r\nMIAG',
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: kindsAre('signature'),
  },
  {
    name: 'signed mail in one piece (S/MIME, opaque)',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: application/pkcs7-mime; smime-type=signed-data; name=smime.p7m\r\nContent-Transfer-Encoding: base64\r\n`,
        'MIAG',
      ),
    defects: ['opaque-signed', 'text-missing'],
    expectedDecision: 'unreadable',
  },
  {
    name: 'encrypted mail (S/MIME)',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: application/pkcs7-mime; smime-type=enveloped-data; name=smime.p7m\r\nContent-Transfer-Encoding: base64\r\n`,
        'MIAG',
      ),
    defects: ['encrypted', 'text-missing'],
    expectedDecision: 'unreadable',
  },
  {
    name: 'encrypted mail (OpenPGP)',
    channel: 'mail',
    build: () =>
      multipart('encrypted; protocol="application/pgp-encrypted"', [
        'Content-Type: application/pgp-encrypted\r\n\r\nVersion: 1',
        'Content-Type: application/octet-stream; name=encrypted.asc\r\n\r\n-----BEGIN PGP MESSAGE-----\r\nhQEM\r\n-----END PGP MESSAGE-----',
      ]),
    defects: ['encrypted', 'text-missing'],
    expectedDecision: 'unreadable',
  },
  {
    name: 'encrypted text in the body (OpenPGP)',
    channel: 'mail',
    build: () =>
      plain(`-----BEGIN PGP MESSAGE-----\r\n\r\n${'hQEMA1vT'.repeat(200)}\r\n-----END PGP MESSAGE-----\r\n`),
    defects: [],
    expectedDecision: 'by-words',
  },
  {
    name: 'a delivery report',
    channel: 'mail',
    build: () =>
      multipart(
        'report; report-type=delivery-status',
        [
          textPart('Your message could not be delivered.'),
          'Content-Type: message/delivery-status\r\n\r\nReporting-MTA: dns; mx.example\r\n\r\nFinal-Recipient: rfc822; a@b.example\r\nAction: failed\r\nStatus: 5.1.1',
          `Content-Type: message/rfc822\r\n\r\nFrom: contact@fenmarkwater.example\r\nSubject: ${padding}\r\n\r\n${padding}`,
        ],
        'frontier',
        'Return-Path: <>\r\nAuto-Submitted: auto-replied\r\n',
      ),
    defects: [],
    isExact: true,
    keeps: 'could not be delivered',
    drops: 'sewer',
    expectedDecision: 'by-words',
    check: ({ facts }) => (facts.isDeliveryReport && facts.isAutomatic ? null : 'not known as a report'),
  },
  {
    name: 'a delivery report without parts',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: multipart/report; report-type=delivery-status; boundary=b\r\n`,
        plea,
      ),
    defects: ['boundary-missing'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ facts }) => (facts.isDeliveryReport ? null : 'not known as a report'),
  },
  {
    name: 'a reading receipt',
    channel: 'mail',
    build: () =>
      multipart('report; report-type=disposition-notification', [
        textPart('Your message was displayed.'),
        'Content-Type: message/disposition-notification\r\n\r\nDisposition: manual-action/MDN-sent-manually; displayed',
      ]),
    defects: [],
    isExact: true,
    keeps: 'was displayed',
    expectedDecision: 'by-words',
    check: ({ facts }) => (facts.isDeliveryReport ? 'taken for a delivery report' : null),
  },
  {
    name: 'an automatic reply to an automatic reply of the desk',
    channel: 'mail',
    build: () =>
      mail(
        'From: contact@fenmarkwater.example\r\nTo: contact@fenmarkwater.example\r\nSubject: Re: Re: Out of office\r\nAuto-Submitted: auto-replied\r\nIn-Reply-To: <1@fenmarkwater.example>\r\n',
        'I am away until Monday.',
      ),
    defects: [],
    isExact: true,
    keeps: 'away until Monday',
    expectedDecision: 'automatic',
    check: ({ facts }) => (facts.isAutomatic && facts.isReply ? null : 'not known as automatic'),
  },
  {
    name: 'an automatic reply of somebody else',
    channel: 'mail',
    build: () =>
      plain('I am away until Monday.', 'Auto-Submitted: auto-replied (vacation)\r\nReturn-Path: <>\r\n'),
    defects: [],
    isExact: true,
    keeps: 'away until Monday',
    expectedDecision: 'by-words',
    check: ({ facts }) => (facts.isAutomatic ? null : 'not known as automatic'),
  },
  {
    name: 'list mail',
    channel: 'mail',
    build: () => plain(plea, 'List-Id: Water news <news.water.example>\r\n'),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ facts }) => (facts.isList ? null : 'not known as list mail'),
  },
  {
    name: 'spam by the verdict of the receiving service',
    channel: 'mail',
    build: () =>
      Buffer.concat([
        Buffer.from('X-SES-Spam-Verdict: FAIL\r\nX-SES-Virus-Verdict: PASS\r\n'),
        plain(plea, 'X-SES-Spam-Verdict: PASS\r\n'),
      ]),
    defects: [],
    keeps: plea,
    expectedDecision: 'suspect',
    check: ({ facts }) => (facts.spam === 'fail' ? null : 'verdict of the sender believed'),
  },
  {
    name: 'a virus by the verdict of the receiving service',
    channel: 'mail',
    build: () =>
      Buffer.concat([Buffer.from('X-SES-Spam-Verdict: PASS\r\nX-SES-Virus-Verdict: FAIL\r\n'), plain(plea)]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'suspect',
  },
  {
    name: 'text that comes only as an attachment',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        `Content-Type: text/plain; charset=utf-8; name=letter.txt\r\nContent-Disposition: attachment; filename=letter.txt\r\n\r\n${plea}`,
      ]),
    defects: ['text-in-attachment'],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: kindsAre('document'),
  },
  {
    name: 'an attached text beside the letter',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        textPart(plea),
        `Content-Type: text/plain\r\nContent-Disposition: attachment; filename=log.txt\r\n\r\n${padding}`,
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
  },
  {
    name: 'nothing but a picture',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: image/jpeg; name=meter.jpg\r\nContent-Transfer-Encoding: base64\r\n`,
        '/9j/',
      ),
    defects: ['text-missing'],
    isExact: true,
    expectedDecision: 'by-words',
    check: kindsAre('image'),
  },
  {
    name: 'a message only forwarded as an attachment',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        `Content-Type: message/rfc822\r\n\r\nFrom: c@d.example\r\nSubject: Meter\r\n\r\n${plea}`,
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ ownText }) => (ownText.includes(plea) ? null : 'nothing left'),
  },
  {
    name: 'a piece of a message (message/partial)',
    channel: 'mail',
    build: () =>
      mail(
        `${address}Subject: Question\r\nContent-Type: message/partial; id="1@a"; number=2; total=9\r\n`,
        plea,
      ),
    defects: ['text-missing'],
    expectedDecision: 'by-words',
    check: kindsAre('message'),
  },
  {
    name: 'a pointer to a body elsewhere (message/external-body)',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        textPart(plea),
        'Content-Type: message/external-body; access-type=anon-ftp; site=evil.example\r\n\r\nContent-Type: text/plain\r\n\r\n',
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a mail of accelerated pages beside its HTML',
    channel: 'mail',
    build: () =>
      multipart('alternative', [
        textPart(plea),
        `Content-Type: text/x-amp-html\r\n\r\n<p>${padding}</p>`,
        htmlPart(`<p>${plea}</p>`),
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
    check: kindsAre(),
  },
  {
    name: 'a double-ended file name',
    channel: 'mail',
    build: () =>
      multipart('mixed', [
        textPart(plea),
        'Content-Type: application/octet-stream\r\nContent-Disposition: attachment; filename="invoice.pdf .exe"\r\n\r\nMZ',
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: kindsAre('other'),
  },
];
