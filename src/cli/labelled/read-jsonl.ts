import { bounds } from '../../bounds.ts';
import { bad, formJson, type Labelled, type LabelledStream, readTime, type Unusable } from './labelled.ts';
import { readLines } from './read-lines.ts';

/** Lines `{"queue","mail"}` or `{"queue","form":{"id","fields":{...}}}`, optional "at"; unknown members are ignored, so that
 *  an export can carry its own. Blank lines are skipped. */
export async function* readJsonl(chunks: AsyncIterable<Uint8Array>, file: string): LabelledStream {
  for await (const { number, bytes } of readLines(chunks, bounds.labelledLineBytesMax)) {
    const place = `${file}:${number}`;
    if (bytes === null) {
      yield bad(
        'line-too-long',
        place,
        `at most ${bounds.labelledLineBytesMax} bytes a line`,
        'a longer line',
      );
      continue;
    }
    const text = bytes.toString('utf8').replace(/^\uFEFF/, '');
    if (text.trim() === '') continue;
    let value: unknown;
    try {
      value = JSON.parse(text);
    } catch {
      yield bad('json-unreadable', place, 'one JSON object a line', 'text that is not JSON');
      continue;
    }
    yield readRecord(value, place);
  }
}

/** One record as above, from parsed JSON. */
export function readRecord(value: unknown, place: string): Labelled | Unusable {
  if (!isObject(value)) return bad('record-not-object', place, 'a JSON object', kindOf(value));
  const label = typeof value.queue === 'number' ? String(value.queue) : value.queue;
  if (typeof label !== 'string' || label.trim() === '')
    return bad('queue-missing', place, '"queue": a text', kindOf(value.queue));
  let atMs: number | null = null;
  if (value.at !== undefined && value.at !== null) {
    atMs = readTime(value.at);
    if (atMs === null)
      return bad('time-unreadable', place, '"at": a time as 2026-03-01T10:00:00Z', kindOf(value.at));
  }
  const common = { kind: 'item', label: label.trim(), atMs, place } as const;
  if (typeof value.mail === 'string') {
    const raw = mailBytes(value.mail);
    if (raw.length > bounds.rawBytesMax)
      return bad(
        'message-too-large',
        place,
        `at most ${bounds.rawBytesMax} bytes a message`,
        `${raw.length} bytes`,
      );
    return { ...common, content: { kind: 'mail', raw } };
  }
  if (value.form !== undefined) {
    const form = readFormRecord(value.form, place, atMs);
    return form instanceof Uint8Array ? { ...common, content: { kind: 'form', json: form } } : form;
  }
  return bad(
    'content-missing',
    place,
    '"mail": a text, or "form": {"id", "fields"}',
    `"mail" is ${kindOf(value.mail)}, "form" is missing`,
  );
}

/** Form JSON from `{"id" or "form", "fields"}`; values that are numbers or booleans are taken as their text. */
export function readFormRecord(value: unknown, place: string, atMs: number | null): Uint8Array | Unusable {
  if (!isObject(value)) return bad('form-not-object', place, '"form": {"id", "fields"}', kindOf(value));
  const id = value.id ?? value.form ?? 'form';
  if (typeof id !== 'string') return bad('form-id-not-text', place, '"id": a text', kindOf(id));
  if (!isObject(value.fields))
    return bad('fields-not-object', place, '"fields": {"name": "value"}', kindOf(value.fields));
  const fields: [string, string][] = [];
  for (const [name, given] of Object.entries(value.fields)) {
    if (given === null) continue;
    const parts = Array.isArray(given) ? given : [given];
    if (parts.some((part) => typeof part === 'object'))
      return bad(
        'field-not-text',
        place,
        'field values that are texts',
        'a field that is an object or a list of them',
      );
    fields.push([name, parts.map(String).join('\n')]);
  }
  // Object.fromEntries and not assignment: a field may be called __proto__.
  return formJson(id, Object.fromEntries(fields), atMs === null ? null : new Date(atMs).toISOString());
}

/** UTF-8, but lone surrogates U+DC80..U+DCFF are the bytes 0x80..0xFF that they stand for: how Python's
 *  "surrogateescape" (PEP 383) writes mail that is not UTF-8 into JSON. */
function mailBytes(mail: string): Uint8Array {
  if (!/\p{Surrogate}/u.test(mail)) return Buffer.from(mail, 'utf8');
  const parts: Buffer[] = [];
  let from = 0;
  for (let at = 0; at < mail.length; at += 1) {
    const unit = mail.charCodeAt(at);
    if (unit >= 0xd800 && unit <= 0xdbff && isLowSurrogate(mail.charCodeAt(at + 1))) at += 1;
    else if (unit >= 0xdc80 && unit <= 0xdcff) {
      parts.push(Buffer.from(mail.slice(from, at), 'utf8'), Buffer.of(unit - 0xdc00));
      from = at + 1;
    }
  }
  parts.push(Buffer.from(mail.slice(from), 'utf8'));
  return Buffer.concat(parts);
}

const isLowSurrogate = (unit: number) => unit >= 0xdc00 && unit <= 0xdfff;

export function isObject(value: unknown): value is Record<string, unknown> {
  return typeof value === 'object' && value !== null && !Array.isArray(value);
}

export function kindOf(value: unknown): string {
  if (value === undefined) return 'nothing';
  if (value === null) return 'null';
  if (Array.isArray(value)) return 'a list';
  return typeof value === 'object' ? 'an object' : `a ${typeof value}`;
}
