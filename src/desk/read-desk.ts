import { domainToASCII } from 'node:url';
import type * as z from 'zod/mini';
import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import type { Desk } from './desk.ts';
import { type DeskFile, deskFile } from './desk-file.ts';
import { DeskError, type DeskProblem, pointerOf, shownValue } from './desk-problem.ts';
import { brokenRules } from './desk-rules.ts';

/** Reads a desk's file: UTF-8 JSON of the shape that desk.schema.json publishes. Defaults are filled in; addresses and
 *  domains are lower-cased, domains in ASCII form. `place` names the file in errors.
 *  Throws TallypostError `desk-too-large`, `desk-not-json`, or a DeskError with every problem: first of single members,
 *  and when these are right, of what must hold between them. */
export function readDesk(json: Uint8Array, place: string): Desk {
  const parsed = deskFile.safeParse(parseJson(json, place), { reportInput: true });
  if (!parsed.success) throw new DeskError(place, parsed.error.issues.flatMap(problemsOf));
  const broken = brokenRules(parsed.data);
  if (broken.length > 0) throw new DeskError(place, broken);
  return deskOf(parsed.data);
}

function parseJson(json: Uint8Array, place: string): unknown {
  if (json.length > bounds.deskBytesMax) {
    throw new TallypostError({
      code: 'desk-too-large',
      place,
      expected: `at most ${bounds.deskBytesMax} bytes`,
      got: `${json.length} bytes`,
    });
  }
  let text = '';
  try {
    text = new TextDecoder('utf-8', { fatal: true }).decode(json);
    return JSON.parse(text);
  } catch (cause) {
    const got = cause instanceof SyntaxError ? syntaxOf(cause.message, text) : 'bytes that are not UTF-8';
    throw new TallypostError({ code: 'desk-not-json', place, expected: 'JSON in UTF-8', got }, cause);
  }
}

/** V8 says `… in JSON at position 12`, newer versions the line too, and nothing of the place when the text is short. */
function syntaxOf(message: string, text: string): string {
  if (text.trim() === '') return 'an empty file';
  const position = /position (\d+)/.exec(message)?.[1];
  if (position === undefined) return shownValue(message);
  const before = text.slice(0, Number(position)).split('\n');
  return `a syntax error in line ${before.length}, column ${before.at(-1)!.length + 1}`;
}

type Issue = z.core.$ZodIssue;

function problemsOf(issue: Issue): DeskProblem[] {
  const path = issue.path;
  if (issue.code === 'unrecognized_keys') {
    return issue.keys.map((key) => ({
      pointer: pointerOf([...path, key]),
      expected: 'no member of this name',
      got: shownValue(key),
    }));
  }
  return [{ pointer: pointerOf(path), expected: expectedOf(issue), got: shownValue(issue.input) }];
}

/** The shape's own wording; plain types have none. */
function expectedOf(issue: Issue): string {
  if (issue.code !== 'invalid_type' || issue.message !== 'Invalid input') return issue.message;
  const article = { object: 'an object', array: 'a list', string: 'a string' } as Record<string, string>;
  return article[issue.expected] ?? issue.expected;
}

function deskOf(file: DeskFile): Desk {
  const { $schema: _, intake, ...rest } = file;
  return {
    ...rest,
    ...(intake === undefined ? {} : { intake }),
    ownAddresses: file.ownAddresses.map(addressOf),
    ownDomains: file.ownDomains.map(domainOf),
    queues: file.queues.map((queue) => ({
      id: queue.id,
      title: queue.title,
      wrongRouteMinutes: queue.wrongRouteMinutes ?? file.costs.wrongRouteMinutes,
    })),
    senderClasses: file.senderClasses.map(({ id, domains }) => ({ id, domains: domains.map(domainOf) })),
    guards: file.guards.map((guard) => ({ ...guard, senders: guard.senders.map(addressOf) })),
  };
}

/** As `Message` holds addresses and domains: lower case, domain in ASCII (IDNA) form. */
function addressOf(address: string): string {
  const at = address.lastIndexOf('@');
  return `${address.slice(0, at).toLowerCase()}@${domainOf(address.slice(at + 1))}`;
}

function domainOf(domain: string): string {
  return domainToASCII(domain) || domain.toLowerCase();
}
