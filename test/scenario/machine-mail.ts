import { utcOffsetMinutes } from './calendar.ts';
import { boundary } from './mail.ts';
import { bytesOf, headerDate, headerText, multipart, textPart } from './mime.ts';
import type { Person } from './people.ts';
import type { Chance } from './random.ts';
import type { QueueId } from './topic.ts';

/** Mail that machines write: automatic replies (RFC 3834) and delivery reports (RFC 3464). */

const desk = 'fenmarkwater.example';

/** What we sent out, and who gets the answers to it. */
const sentOut: readonly { queue: QueueId; alias: string; subject: string; weight: number }[] = [
  { queue: 'billing', alias: 'bills', subject: 'Your bill from Fenmark Water is ready', weight: 5 },
  { queue: 'meter-readings', alias: 'readings', subject: 'Please send us your meter reading', weight: 3 },
  { queue: 'suppliers', alias: 'purchasing', subject: 'Remittance advice', weight: 2 },
  { queue: 'complaints', alias: 'complaints', subject: 'Our answer to your complaint', weight: 1 },
];

const away: Readonly<Record<Person['language'], readonly [string, string]>> = {
  english: ['Automatic reply: ', 'I am out of the office until Monday and will answer when I am back.'],
  polish: ['Odpowiedź automatyczna: ', 'Jestem na urlopie do poniedziałku. Odpowiem po powrocie.'],
  german: ['Automatische Antwort: ', 'Ich bin bis Montag nicht im Büro und antworte danach.'],
};

export interface MachineMail {
  readonly queue: QueueId;
  readonly bytes: Uint8Array;
}

export function machineMail(person: Person, atMs: number, chance: Chance): MachineMail {
  const weights = Object.fromEntries(sentOut.map((each, i) => [i, each.weight]));
  const sent = sentOut[Number(chance.weighted(weights))] as (typeof sentOut)[number];
  const bytes = chance.isTrue(0.6)
    ? awayReply(person, sent, atMs, chance)
    : deliveryReport(person, sent, atMs, chance);
  return { queue: sent.queue, bytes };
}

function front(from: string, to: string, subject: string, atMs: number, chance: Chance): [string, string][] {
  return [
    ['Return-Path', '<>'],
    ['X-SES-Spam-Verdict', 'PASS'],
    ['X-SES-Virus-Verdict', 'PASS'],
    ['From', from],
    ['To', to],
    ['Subject', headerText(subject, 'B')],
    ['Date', headerDate(atMs, utcOffsetMinutes(atMs))],
    ['Message-ID', `<${chance.hex(12)}@mx.test>`],
    ['MIME-Version', '1.0'],
  ];
}

function awayReply(person: Person, sent: (typeof sentOut)[number], atMs: number, chance: Chance): Uint8Array {
  const [prefix, text] = away[person.language];
  const headers = front(person.address, `${sent.alias}@${desk}`, prefix + sent.subject, atMs, chance);
  const extra: [string, string][] = [
    ['Auto-Submitted', 'auto-replied'],
    ['In-Reply-To', `<${chance.hex(12)}@${desk}>`],
  ];
  const name = person.name;
  return bytesOf(textPart('text/plain', `${text}\n\n${name}\n`, 'utf-8', 'quoted-printable'), [
    ...headers,
    ...extra,
  ]);
}

function deliveryReport(
  person: Person,
  sent: (typeof sentOut)[number],
  atMs: number,
  chance: Chance,
): Uint8Array {
  const domain = person.address.split('@')[1] as string;
  const words = `Your message could not be delivered to ${person.address}.\n\nThe mailbox does not exist.\n`;
  const status = [
    `Reporting-MTA: dns; mx.${domain}`,
    '',
    `Final-Recipient: rfc822; ${person.address}`,
    'Action: failed',
    'Status: 5.1.1',
    '',
  ].join('\n');
  const original = `From: ${sent.alias}@${desk}\nTo: ${person.address}\nSubject: ${sent.subject}\n`;
  const report = multipart(
    'report',
    [
      textPart('text/plain', words, 'us-ascii', '7bit'),
      textPart('message/delivery-status', status, 'us-ascii', '7bit'),
      textPart('text/rfc822-headers', original, 'us-ascii', '7bit'),
    ],
    boundary(chance),
    'report-type=delivery-status; ',
  );
  const headers = front(
    `Mail Delivery System <mailer-daemon@${domain}>`,
    `${sent.alias}@${desk}`,
    'Undelivered mail returned to sender',
    atMs,
    chance,
  );
  return bytesOf(report, [...headers, ['Auto-Submitted', 'auto-replied']]);
}
