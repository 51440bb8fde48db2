import { bounds } from '../bounds.ts';
import { readAddress } from './addresses.ts';
import { cleanLine, cleanText, cutText } from './clean-text.ts';
import { Defects } from './defects.ts';
import type { Form, HeaderFacts, Message } from './message.ts';

const noFacts: HeaderFacts = {
  isReply: false,
  isAutomatic: false,
  isList: false,
  isDeliveryReport: false,
  spam: 'missing',
  virus: 'missing',
};

/** Parses one form submission, `{"form", "at", "from", "suspicion", "fields": {name: value}}` in UTF-8 JSON. Never throws: unreadable
 *  JSON gives an empty message with the defect `form-unreadable`. The text is that of all fields, in order, joined by
 *  blank lines; which of them are closed lists only the desk knows. */
export function parseForm(json: Uint8Array): Message {
  const defects = new Defects();
  const data = readJson(json, defects);
  const fields = readFields(data.fields, defects);
  const id = typeof data.form === 'string' ? cleanLine(data.form, 'form', defects) : '';
  if (id === '' || id.length > bounds.fieldNameCharsMax) defects.add('field-unreadable', 'form');
  // Whatever took the submission says so here, when a program may have sent it; absent or null: nothing speaks for that.
  if (data.suspicion !== undefined && data.suspicion !== null) defects.add('form-suspect', 'suspicion');
  const text = joinFields(fields, defects);
  if (text === '') defects.add('text-missing', 'message');
  const form: Form = { id: cutText(id, bounds.fieldNameCharsMax), fields: Object.fromEntries(fields) };
  return {
    channel: 'form',
    messageId: '',
    from: readFrom(data.from, defects),
    recipients: [],
    subject: '',
    text,
    ownText: text,
    attachments: [],
    facts: noFacts,
    sentAtMs: readTime(data.at, defects),
    form,
    defects: defects.list,
  };
}

function readJson(json: Uint8Array, defects: Defects): Record<string, unknown> {
  if (json.length > bounds.formBytesMax) {
    defects.add('form-cut', 'message');
    defects.add('form-unreadable', 'message');
    return {};
  }
  try {
    const data: unknown = JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(json));
    if (isRecord(data)) return data;
  } catch {
    // Fatal decoding and JSON errors alike; the message says no more than the defect.
  }
  defects.add('form-unreadable', 'message');
  return {};
}

function readFields(value: unknown, defects: Defects): [name: string, value: string][] {
  if (!isRecord(value)) {
    if (!defects.list.some(({ code }) => code === 'form-unreadable'))
      defects.add('field-unreadable', 'fields');
    return [];
  }
  const names = new Set<string>();
  const fields: [string, string][] = [];
  let room: number = bounds.textCharsMax;
  for (const [rawName, rawValue] of Object.entries(value)) {
    if (fields.length >= bounds.formFieldsMax) {
      defects.add('fields-cut', 'fields');
      break;
    }
    const name = cutText(cleanLine(rawName, 'fields', defects), bounds.fieldNameCharsMax);
    if (name.length < rawName.length && rawName.length > bounds.fieldNameCharsMax)
      defects.add('field-cut', 'fields');
    if (name === '' || names.has(name)) {
      defects.add('field-unreadable', 'fields');
      continue;
    }
    const text = readValue(rawValue);
    if (text === null) {
      if (rawValue !== null) defects.add('field-unreadable', placeOf(name));
      continue;
    }
    const clean = cleanText(text, placeOf(name), defects).trim();
    if (clean.length > room) defects.add('field-cut', placeOf(name));
    const kept = cutText(clean, Math.max(0, room));
    room -= kept.length;
    names.add(name);
    fields.push([name, kept]);
  }
  return fields;
}

/** A field's text: several choices of one field come as a list. */
function readValue(value: unknown): string | null {
  if (typeof value === 'string') return value;
  if (typeof value === 'number' || typeof value === 'boolean') return String(value);
  if (Array.isArray(value) && value.every((item) => typeof item === 'string')) {
    return value.slice(0, bounds.formFieldsMax).join(', ');
  }
  return null;
}

/** A field's name as a place: only when it looks like one, since anyone can post names. */
function placeOf(name: string): string {
  return /^[\w.-]{1,40}$/.test(name) ? name : 'fields';
}

function joinFields(fields: readonly (readonly [string, string])[], defects: Defects): string {
  const text = fields
    .map(([, value]) => value)
    .filter((value) => value !== '')
    .join('\n\n');
  if (text.length > bounds.textCharsMax) defects.add('text-cut', 'message');
  return cutText(text, bounds.textCharsMax);
}

function readFrom(value: unknown, defects: Defects): Message['from'] {
  if (value === undefined || value === null || value === '') return null;
  const address = typeof value === 'string' ? readAddress(value) : null;
  if (address === null) defects.add('address-unreadable', 'from');
  return address;
}

/** ISO 8601 with a zone, as JSON.stringify writes a date; a time without zone would mean another on each machine. */
function readTime(value: unknown, defects: Defects): number | null {
  if (value === undefined || value === null) return null;
  if (
    typeof value === 'string' &&
    /^\d{4}-\d{2}-\d{2}T\d{2}:\d{2}(?::\d{2}(?:\.\d{1,9})?)?(?:Z|[+-]\d{2}:\d{2})$/.test(value)
  ) {
    const time = Date.parse(value);
    if (!Number.isNaN(time)) return time;
  }
  defects.add('date-unreadable', 'at');
  return null;
}

function isRecord(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}
