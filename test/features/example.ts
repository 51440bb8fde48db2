import type { Desk } from '../../src/desk/desk.ts';
import type { Message } from '../../src/message/message.ts';

/** A small desk of an invented water company. */
export const exampleDesk: Desk = {
  version: 1,
  name: 'Fenmark Water',
  timeZone: 'Europe/London',
  ownAddresses: ['help@fenmarkwater.example', 'billing@fenmarkwater.example'],
  ownDomains: ['fenmarkwater.example'],
  queues: [
    { id: 'billing', title: 'Bills and payments', wrongRouteMinutes: 10 },
    { id: 'leaks', title: 'Leaks and bursts', wrongRouteMinutes: 25 },
    { id: 'moving', title: 'Moving home', wrongRouteMinutes: 10 },
  ],
  costs: { lookMinutes: 2, wrongRouteMinutes: 10 },
  senderClasses: [{ id: 'council', domains: ['council.example', 'gov.example'] }],
  references: [{ id: 'account', pattern: 'FW-########' }],
  forms: ['contact', 'leak'],
  fields: [{ form: 'contact', field: 'topic', values: ['A bill', 'A leak', 'A move'] }],
  guards: [],
  auditShare: 0,
  halfLifeDays: null,
};

/** 0x00 to 0x0f: the key of SipHash's published test vectors. */
export const exampleKey = Uint8Array.from({ length: 16 }, (_, i) => i);

const plainFacts = {
  isReply: false,
  isAutomatic: false,
  isList: false,
  isDeliveryReport: false,
  spam: 'pass',
  virus: 'pass',
} as const;

/** A plain mail to the desk's first address; `changes` on top. */
export function mailOf(changes: Partial<Message> = {}): Message {
  const text = changes.text ?? changes.ownText ?? 'My bill looks too high.';
  return {
    channel: 'mail',
    messageId: 'a1@mail.test',
    from: { address: 'ana@home.test', domain: 'home.test' },
    recipients: [{ address: 'help@fenmarkwater.example', domain: 'fenmarkwater.example' }],
    subject: 'Question',
    text,
    ownText: text,
    attachments: [],
    facts: plainFacts,
    sentAtMs: Date.UTC(2026, 2, 2, 9, 30),
    form: null,
    defects: [],
    ...changes,
  };
}

/** A submission of a form with these fields; `changes` on top. */
export function formOf(id: string, fields: Record<string, string>, changes: Partial<Message> = {}): Message {
  const text = Object.values(fields).join('\n\n');
  return mailOf({
    channel: 'form',
    messageId: '',
    from: null,
    recipients: [],
    subject: '',
    text,
    ownText: text,
    form: { id, fields },
    ...changes,
  });
}
