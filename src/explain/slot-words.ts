/** What the closed slots say, for a reader who has never seen the schema. */

type Wording = (value: string) => string;

const days: Readonly<Record<string, string>> = {
  mon: 'Monday',
  tue: 'Tuesday',
  wed: 'Wednesday',
  thu: 'Thursday',
  fri: 'Friday',
  sat: 'Saturday',
  sun: 'Sunday',
};
const hours: Readonly<Record<string, string>> = {
  night: 'at night',
  morning: 'in the morning',
  afternoon: 'in the afternoon',
  evening: 'in the evening',
};
const origins: Readonly<Record<string, string>> = {
  person: 'written by a person',
  automatic: 'sent by a machine',
  list: 'sent to a mailing list',
  'delivery-report': 'a report on mail that was not delivered',
};

const wordings: Readonly<Record<string, Wording>> = {
  channel: (value) => (value === 'form' ? 'came through a form' : 'came as mail'),
  recipient: (value) =>
    or(value, 'names no recipient', 'written to an address that is not ours', `written to ${value}`),
  sender: (value) =>
    or(value, 'names no sender', 'from a sender of no listed kind', `from a sender of the kind “${value}”`),
  thread: (value) =>
    or(
      value,
      'not a letter',
      'neither new nor a reply',
      value === 'reply' ? 'answers an earlier mail' : 'opens a new matter',
    ),
  origin: (value) => or(value, 'of no known origin', 'of another origin', origins[value] ?? value),
  attachments: (value) =>
    or(
      value,
      'cannot hold attachments',
      'an attachment of another kind',
      value === 'none'
        ? 'nothing is attached'
        : value === 'several'
          ? 'attachments of several kinds'
          : `an attachment (${value})`,
    ),
  length: (value) => or(value, 'of no known length', 'of another length', lengthWords(value)),
  day: (value) => or(value, 'bears no date', 'sent on another day', `sent on a ${days[value] ?? value}`),
  hour: (value) => or(value, 'bears no time', 'sent at another time', `sent ${hours[value] ?? value}`),
  script: (value) => or(value, 'holds no letters', 'in another script', `in ${value} script`),
  form: (value) =>
    or(value, 'no form was used', 'through a form that is not listed', `through the form “${value}”`),
};

/** A slot's value in words; ids of slots that are not known here are shown as they are. */
export function describeSlot(slot: string, value: string): string {
  const wording = wordings[slot];
  if (wording !== undefined) return wording(value);
  if (slot.startsWith('reference:')) {
    const id = slot.slice('reference:'.length);
    return value === 'present'
      ? `holds a reference of the kind “${id}”`
      : `holds no reference of the kind “${id}”`;
  }
  if (slot.startsWith('field:')) {
    const [form, field] = slot.slice('field:'.length).split('/') as [string, string];
    return or(
      value,
      `nothing chosen for “${field}” (form “${form}”)`,
      `something of their own for “${field}” (form “${form}”)`,
      `chose “${value}” for “${field}”`,
    );
  }
  return `${slot}: ${value}`;
}

function or(value: string, missing: string, other: string, else_: string): string {
  return value === 'missing' ? missing : value === 'other' ? other : else_;
}

function lengthWords(value: string): string {
  if (value === 'empty') return 'holds no text';
  return value.startsWith('to-')
    ? `at most ${value.slice(3)} characters long`
    : `over ${value.slice(5)} characters long`;
}
