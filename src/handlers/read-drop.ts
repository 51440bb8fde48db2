import * as z from 'zod/mini';
import { bounds } from '../bounds.ts';
import { pointerOf, shownValue } from '../desk/desk-problem.ts';
import { TallypostError } from '../errors.ts';
import type { Confirmation } from '../ledger/world.ts';

const line = (what: string, charsMax: number) =>
  z
    .string(`a string, ${what}`)
    .check(
      z.regex(/^[^\p{Cc}\u2028\u2029]*\S[^\p{Cc}\u2028\u2029]*$/u, `${what}, in one line`),
      z.maxLength(charsMax, `at most ${charsMax} characters`),
    );
// RFC 3339 section 5.6: what both a person and every library writes for ISO 8601.
const time = /^\d{4}-\d{2}-\d{2}[Tt]\d{2}:\d{2}(:\d{2}(\.\d+)?)?([Zz]|[+-]\d{2}:\d{2})$/;

const drop = z.strictObject({
  message: line('the key of the message without inbound/', bounds.messageIdCharsMax),
  queue: line('a queue id', bounds.confirmationLineCharsMax),
  by: line('who confirmed', bounds.confirmationLineCharsMax),
  at: z
    .string('a time such as 2026-03-01T10:00:00Z')
    .check(
      z.refine(
        (text) => time.test(text) && Number.isFinite(Date.parse(text)),
        'a time such as 2026-03-01T10:00:00Z',
      ),
    ),
});

/** A dropped confirmation, whole: unknown members are refused, since a misspelt one would otherwise be silently ignored.
 *  Throws TallypostError `confirmation-invalid` with the first thing that is wrong. */
export function readDrop(json: Uint8Array, place: string): Confirmation {
  let value: unknown;
  try {
    value = JSON.parse(new TextDecoder('utf-8', { fatal: true }).decode(json));
  } catch (cause) {
    throw invalid(place, 'JSON in UTF-8', `${json.length} other bytes`, cause);
  }
  const parsed = drop.safeParse(value, { reportInput: true });
  if (parsed.success) return parsed.data;
  const issue = parsed.error.issues[0]!;
  // The member's name stays unsaid: anything may stand there.
  if (issue.code === 'unrecognized_keys')
    throw invalid(place, 'only message, queue, by and at', 'another member');
  const pointer = issue.path.length === 0 ? '' : `#${pointerOf(issue.path)}`;
  throw invalid(
    place + pointer,
    issue.path.length === 0 ? 'an object' : issue.message,
    shownValue(issue.input),
  );
}

function invalid(place: string, expected: string, got: string, cause?: unknown): TallypostError {
  return new TallypostError({ code: 'confirmation-invalid', place, expected, got }, cause);
}
