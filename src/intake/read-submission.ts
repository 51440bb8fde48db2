import { bounds } from '../bounds.ts';
import type { IntakeForm } from '../desk/intake-settings.ts';
import { type FieldFault, type Reply, replyProblem } from './reply.ts';
import { type IntakeRequest, mediaTypeOf, nestsDeeperThan, textOf } from './request.ts';

/** A form submission that fits its declaration. */
export interface Submission {
  /** Declared, visible fields in the declared order, but the sender's. */
  readonly fields: ReadonlyMap<string, string>;
  readonly sender: string | null;
  /** Why a machine may have sent it; null: nothing speaks for that. */
  readonly suspicion: 'trap-filled' | 'sent-too-soon' | null;
}

type Raw = ReadonlyMap<string, string>;

function isReply(value: Raw | Reply): value is Reply {
  return 'status' in value;
}

function readJson(text: string): Raw | Reply {
  if (nestsDeeperThan(text, bounds.intakeJsonDepthMax)) {
    return replyProblem(400, 'json-too-deep', `JSON may nest ${bounds.intakeJsonDepthMax} levels at most.`);
  }
  let value: unknown;
  try {
    value = JSON.parse(text);
  } catch {
    return replyProblem(400, 'json-unreadable', 'The body is not valid JSON (RFC 8259).');
  }
  if (typeof value !== 'object' || value === null || Array.isArray(value)) {
    return replyProblem(422, 'not-an-object', 'The body must be one JSON object of field names and values.');
  }
  const raw = new Map<string, string>();
  const errors: FieldFault[] = [];
  for (const [name, given] of Object.entries(value)) {
    if (typeof given === 'string') raw.set(name, given);
    else if (typeof given === 'number' || typeof given === 'boolean') raw.set(name, String(given));
    else if (given !== null)
      errors.push({ pointer: pointerTo(name), expected: 'text, a number, true or false' });
  }
  return errors.length === 0
    ? raw
    : replyProblem(422, 'field-type', 'Some fields are neither text, number nor boolean.', {
        errors: errors.slice(0, bounds.intakeFaultsMax),
      });
}

function readFormEncoded(text: string): Raw | Reply {
  const raw = new Map<string, string>();
  for (const [name, given] of new URLSearchParams(text)) {
    if (raw.has(name)) {
      return replyProblem(422, 'field-repeated', 'A field stands more than once.', {
        errors: [{ pointer: pointerTo(name), expected: 'the field once' }],
      });
    }
    raw.set(name, given);
  }
  return raw;
}

/** RFC 6901 section 3; a name of any length and characters is shortened, so that an answer stays small and printable. */
function pointerTo(name: string): string {
  const shown = name.slice(0, 40).replace(/[^\x20-\x7e]/g, '?');
  return `/${shown.replace(/~/g, '~0').replace(/\//g, '~1')}`;
}

/** Control characters but tab and line ends never belong into a form's text. */
const forbiddenControls = /(?![\t\n\r])\p{Cc}/u;

function faultsOf(form: IntakeForm, raw: Raw): FieldFault[] {
  const faults: FieldFault[] = [];
  const hidden = new Set([form.trapField, form.shownAtField]);
  const declared = new Map(form.fields.map((field) => [field.name, field]));
  for (const [name, given] of raw) {
    if (hidden.has(name)) continue;
    const field = declared.get(name);
    if (field === undefined) {
      faults.push({ pointer: pointerTo(name), expected: 'no field of this name: it is not declared' });
    } else if (given.length > field.charactersMax) {
      faults.push({ pointer: pointerTo(name), expected: `at most ${field.charactersMax} characters` });
    } else if (forbiddenControls.test(given)) {
      faults.push({ pointer: pointerTo(name), expected: 'no control characters' });
    } else if (field.values !== null && given !== '' && !field.values.includes(given)) {
      faults.push({ pointer: pointerTo(name), expected: 'one of the declared values' });
    }
    if (faults.length >= bounds.intakeFaultsMax) return faults;
  }
  for (const field of form.fields) {
    if (field.isRequired && (raw.get(field.name) ?? '').trim() === '') {
      faults.push({ pointer: pointerTo(field.name), expected: 'a value: the field is required' });
    }
  }
  return faults.slice(0, bounds.intakeFaultsMax);
}

function suspicionOf(form: IntakeForm, raw: Raw, nowMs: number): Submission['suspicion'] {
  if (form.trapField !== null && (raw.get(form.trapField) ?? '') !== '') return 'trap-filled';
  if (form.shownAtField !== null) {
    const shownAtMs = Number(raw.get(form.shownAtField) || Number.NaN);
    // Absent or unreadable says nothing: the page may run without scripts.
    if (nowMs - shownAtMs < form.secondsMin * 1000) return 'sent-too-soon';
  }
  return null;
}

/** One addr-spec of bounded length in plain ASCII: it becomes a header-like value, so nothing else may pass. */
const senderShape = /^[A-Za-z0-9.!#$%&'*+/=?^_`{|}~-]{1,64}@[A-Za-z0-9](?:[A-Za-z0-9.-]{0,251}[A-Za-z0-9])?$/;

/** Reads and checks one submission: media type, size, shape, declared fields.
 *  Gives the submission or the problem to answer (400, 413, 415, 422). */
export function readSubmission(form: IntakeForm, request: IntakeRequest, nowMs: number): Submission | Reply {
  if (request.body.length > bounds.intakeFormBytesMax) {
    return replyProblem(
      413,
      'body-too-large',
      `A submission may have ${bounds.intakeFormBytesMax} bytes at most.`,
    );
  }
  const text = textOf(request.body);
  if (text === null) return replyProblem(400, 'not-utf-8', 'The body is not valid UTF-8.');
  const mediaType = mediaTypeOf(request);
  if (mediaType !== 'application/json' && mediaType !== 'application/x-www-form-urlencoded') {
    return replyProblem(415, 'media-type', 'Send application/json or application/x-www-form-urlencoded.', {
      headers: { accept: 'application/json, application/x-www-form-urlencoded' },
    });
  }
  const raw = mediaType === 'application/json' ? readJson(text) : readFormEncoded(text);
  if (isReply(raw)) return raw;
  const errors = faultsOf(form, raw);
  const sender = form.senderField === null ? null : (raw.get(form.senderField) ?? '').trim() || null;
  if (sender !== null && !senderShape.test(sender)) {
    errors.push({
      pointer: pointerTo(form.senderField!),
      expected: 'an e-mail address (addr-spec of RFC 5322 in ASCII)',
    });
  }
  if (errors.length > 0)
    return replyProblem(422, 'fields', 'Some fields do not fit their declaration.', { errors });
  const fields = new Map<string, string>();
  for (const field of form.fields) {
    // An address among the fields would be counted as a word of the text; it stands beside them.
    if (field.name === form.senderField) continue;
    const given = raw.get(field.name);
    if (given !== undefined && given !== '') fields.set(field.name, given);
  }
  return { fields, sender, suspicion: suspicionOf(form, raw, nowMs) };
}
