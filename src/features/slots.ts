import { getDomain } from 'tldts';
import { choiceOf, isUnder } from '../desk/comparison.ts';
import type { ClosedField, Desk } from '../desk/desk.ts';
import { matcherOf } from '../desk/reference-pattern.ts';
import type { Attachment, Message } from '../message/message.ts';
import type { SlotSchema } from './schema.ts';
import { scriptOf, scripts } from './script.ts';

/** What the slots read: the message, and the text that its tokens are drawn from, as written and folded. */
export interface SlotInput {
  readonly message: Message;
  readonly text: string;
  readonly foldedText: string;
}

/** One closed slot and how its value is read; a value outside the list counts as `other`. */
export interface Slot {
  readonly schema: SlotSchema;
  read(input: SlotInput): string;
}

const attachmentKinds = [
  'image',
  'pdf',
  'document',
  'sheet',
  'archive',
  'calendar',
  'audio',
  'video',
  'message',
] as const;
const lengthBands = [
  { id: 'empty', charsMax: 0 },
  { id: 'to-80', charsMax: 80 },
  { id: 'to-250', charsMax: 250 },
  { id: 'to-800', charsMax: 800 },
  { id: 'to-2500', charsMax: 2500 },
  { id: 'over-2500', charsMax: Number.POSITIVE_INFINITY },
] as const;
const days = ['mon', 'tue', 'wed', 'thu', 'fri', 'sat', 'sun'] as const;
const hourBands = ['night', 'morning', 'afternoon', 'evening'] as const;

/** All slots of a desk, in the schema's order. */
export function slotsOf(desk: Desk): Slot[] {
  const dayAndHour = dayAndHourIn(desk.timeZone);
  const aliases = new Set(desk.ownAddresses.map((address) => address.toLowerCase()));
  const senderClass = senderClassIn(desk);
  return [
    slot('channel', 'channel', ['mail', 'form'], ({ message }) => message.channel),
    slot('recipient', 'recipient', [...aliases], ({ message }) => recipientOf(message, aliases)),
    slot('sender', 'sender', ['own', ...desk.senderClasses.map((each) => each.id)], ({ message }) =>
      message.from === null ? 'missing' : senderClass(message.from.domain),
    ),
    slot('thread', 'thread', ['new', 'reply'], ({ message }) =>
      message.channel === 'form' ? 'missing' : message.facts.isReply ? 'reply' : 'new',
    ),
    slot('origin', 'origin', ['person', 'automatic', 'list', 'delivery-report'], ({ message }) =>
      originOf(message),
    ),
    slot('attachments', 'attachments', ['none', ...attachmentKinds, 'several'], ({ message }) =>
      message.channel === 'form' ? 'missing' : attachmentsOf(message.attachments),
    ),
    slot(
      'length',
      'length',
      lengthBands.map((band) => band.id),
      ({ text }) => lengthBandOf(text.length),
    ),
    slot('day', 'time', days, ({ message }) => dayAndHour(message.sentAtMs).day),
    slot('hour', 'time', hourBands, ({ message }) => dayAndHour(message.sentAtMs).hour),
    slot('script', 'script', scripts, ({ text }) => scriptOf(text)),
    ...desk.references.map((reference) => {
      const isIn = matcherOf(reference);
      return slot(`reference:${reference.id}`, 'reference', ['absent', 'present'], ({ foldedText }) =>
        isIn(foldedText) ? 'present' : 'absent',
      );
    }),
    slot('form', 'form', desk.forms, ({ message }) => message.form?.id ?? 'missing'),
    ...desk.fields.map((field) =>
      slot(fieldSlotId(field), 'field', field.values, ({ message }) => fieldValueOf(message, field)),
    ),
  ];
}

/** Where the slot of a closed field stands: `field:<form>/<field>`. */
export function fieldSlotId(field: ClosedField): string {
  return `field:${field.form}/${field.field}`;
}

/** What a form's field holds: a declared choice, `other`, or `missing` (also when the message is not of that form). */
export function fieldValueOf(message: Message, field: ClosedField): string {
  const { form } = message;
  if (form === null || form.id !== field.form || !Object.hasOwn(form.fields, field.field)) return 'missing';
  return choiceOf(field, form.fields[field.field]);
}

function slot(
  id: string,
  group: string,
  values: readonly string[],
  read: (input: SlotInput) => string,
): Slot {
  return { schema: { id, group, values: ['missing', 'other', ...values] }, read };
}

/** The first own address among the recipients, with a `+detail` taken off (RFC 5233 section 1.1 names it subaddress);
 *  `other` when there are recipients, none of them own. */
function recipientOf(message: Message, aliases: ReadonlySet<string>): string {
  if (message.recipients.length === 0) return 'missing';
  for (const { address } of message.recipients) {
    if (aliases.has(address)) return address;
    const bare = address.replace(/\+[^@]*@/, '@');
    if (aliases.has(bare)) return bare;
  }
  return 'other';
}

const rememberedDomainsMax = 1000;

/** Own and declared classes, by domain. A declared domain covers its subdomains; an own domain also covers whatever
 *  shares its registrable domain (Public Suffix List, private section included, so that two customers of one shared
 *  host are not taken for one). */
function senderClassIn(desk: Desk): (domain: string) => string {
  const own = new Set(desk.ownDomains.map((domain) => registrableOf(domain) ?? domain));
  const classOf = (domain: string) => {
    if (own.has(registrableOf(domain) ?? domain)) return 'own';
    return desk.senderClasses.find((each) => each.domains.some((suffix) => isUnder(domain, suffix)))?.id;
  };
  // Much mail comes from few domains.
  const known = new Map<string, string>();
  return (domain) => {
    if (domain === '') return 'missing';
    const found = known.get(domain) ?? classOf(domain) ?? 'other';
    if (known.size >= rememberedDomainsMax) known.clear();
    known.set(domain, found);
    return found;
  };
}

function registrableOf(domain: string): string | null {
  return getDomain(domain, { allowPrivateDomains: true });
}

function originOf(message: Message): string {
  if (message.channel === 'form') return 'missing';
  if (message.facts.isDeliveryReport) return 'delivery-report';
  if (message.facts.isAutomatic) return 'automatic';
  return message.facts.isList ? 'list' : 'person';
}

/** Signatures (S/MIME, OpenPGP) say how a mail was sent, not what it is about: they do not count. */
function attachmentsOf(attachments: readonly Attachment[]): string {
  const kinds = new Set(attachments.map((each) => each.kind).filter((kind) => kind !== 'signature'));
  if (kinds.size === 0) return 'none';
  return kinds.size > 1 ? 'several' : [...kinds][0]!;
}

function lengthBandOf(chars: number): string {
  return lengthBands.find((band) => chars <= band.charsMax)!.id;
}

interface DayAndHour {
  readonly day: string;
  readonly hour: string;
}

/** Clocks are set forward and back at full quarters of an hour (Lord Howe Island's by half an hour). */
const quarterMs = 15 * 60 * 1000;
/** ECMA-262, section "Time Values and Time Range". */
const timeMsMax = 8.64e15;
/** Enough for a day and a half of waiting mail. */
const rememberedQuartersMax = 150;

/** Weekday and quarter of the day on the desk's own clock. */
function dayAndHourIn(timeZone: string): (sentAtMs: number | null) => DayAndHour {
  const missing = { day: 'missing', hour: 'missing' };
  const format = new Intl.DateTimeFormat('en-GB', {
    timeZone,
    weekday: 'short',
    hour: '2-digit',
    hourCycle: 'h23',
  });
  const read = (ms: number): DayAndHour => {
    const parts = format.formatToParts(ms);
    const part = (type: string) => parts.find((each) => each.type === type)?.value ?? '';
    return { day: part('weekday').toLowerCase(), hour: hourBands[Math.floor(Number(part('hour')) / 6)]! };
  };
  // Asking the clock of a zone takes as long as all other slots together, and mail that is routed was sent just now.
  const byQuarter = new Map<number, DayAndHour | null>();
  return (sentAtMs) => {
    if (sentAtMs === null || !(Math.abs(sentAtMs) <= timeMsMax)) return missing;
    const quarter = Math.floor(sentAtMs / quarterMs);
    let known = byQuarter.get(quarter);
    if (known === undefined) {
      if (byQuarter.size >= rememberedQuartersMax) byQuarter.clear();
      const first = read(quarter * quarterMs);
      const last = read(Math.min((quarter + 1) * quarterMs - 1, timeMsMax));
      // Old local times were off by minutes and seconds: such a quarter can belong to two hours, and is not remembered.
      known = first.day === last.day && first.hour === last.hour ? first : null;
      byQuarter.set(quarter, known);
    }
    return known ?? read(sentAtMs);
  };
}
