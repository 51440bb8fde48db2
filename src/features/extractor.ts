import { bounds } from '../bounds.ts';
import type { Desk } from '../desk/desk.ts';
import type { Message } from '../message/message.ts';
import { foldText, wordsOf } from '../text/words.ts';
import type { Features, Schema } from './schema.ts';
import { tokenHex } from './schema.ts';
import { schemaFrom } from './schema-of.ts';
import { fieldValueOf, slotsOf } from './slots.ts';
import { createTokenHash } from './token-hash.ts';

export interface Extractor {
  readonly schema: Schema;
  /** Pure: the same message gives the same features. */
  extract(message: Message): Features;
  /** Token to its text, `<region id>:<10 hex digits>` to words, for explaining; only of this message. */
  words(message: Message): Map<string, string>;
}

/** One list of tokens a region, in the schema's order, repeats included. */
type RegionTokens = (subject: readonly string[], all: readonly string[]) => Iterable<string>;

const regionTokens: readonly RegionTokens[] = [
  (subject) => subject,
  (_subject, all) => all,
  (_subject, all) => pairsOf(all),
  (_subject, all) => gramsOf(all),
];

/** Reads features as this desk declares them, with tokens hashed under its key.
 *  Throws TallypostError `token-key-length`. */
export function createExtractor(desk: Desk, tokenKey: Uint8Array): Extractor {
  const slots = slotsOf(desk);
  const schema = schemaFrom(
    slots.map((slot) => slot.schema),
    tokenKey,
  );
  const valueIndex = schema.slots.map((slot) => new Map(slot.values.map((value, index) => [value, index])));
  const hash = createTokenHash(tokenKey);

  /** Distinct tokens of one region, the first `tokensMax` in reading order: a flood behind a message's beginning
   *  cannot push the beginning out, and nothing more is hashed once the region is full. */
  function take(
    tokens: Iterable<string>,
    tokensMax: number,
    seen: (hashed: number, token: string) => void,
  ): void {
    const distinct = new Set<number>();
    for (const token of tokens) {
      const hashed = hash(token);
      if (distinct.has(hashed)) continue;
      distinct.add(hashed);
      seen(hashed, token);
      if (distinct.size === tokensMax) return;
    }
  }

  function eachToken(message: Message, seen: (region: number, hashed: number, token: string) => void): void {
    const { subject, body } = textsOf(message, desk);
    const subjectWords = wordsOf(foldText(subject));
    const all = [...subjectWords, ...wordsOf(foldText(body))];
    schema.regions.forEach((region, index) => {
      take(regionTokens[index]!(subjectWords, all), region.tokensMax, (hashed, token) =>
        seen(index, hashed, token),
      );
    });
  }

  return {
    schema,
    extract(message) {
      const { subject, body } = textsOf(message, desk);
      const text = subject === '' ? body : `${subject}\n${body}`;
      const input = { message, text: body, foldedText: foldText(text) };
      const values = slots.map((slot, index) => valueIndex[index]!.get(slot.read(input)) ?? 1);
      const tokens: number[][] = schema.regions.map(() => []);
      eachToken(message, (region, hashed) => tokens[region]!.push(hashed));
      return {
        schema: schema.id,
        slots: values,
        regions: tokens.map((each) => Float64Array.from(each).sort()),
      };
    },
    words(message) {
      const words = new Map<string, string>();
      eachToken(message, (region, hashed, token) => {
        words.set(`${schema.regions[region]!.id}:${tokenHex(hashed)}`, token);
      });
      return words;
    },
  };
}

/** What tokens are drawn from: of a mail its subject and what this writer wrote; of a form every field that is not a
 *  declared choice (a choice outside the declared ones is somebody's own words). */
export function textsOf(message: Message, desk: Desk): { subject: string; body: string } {
  const { form } = message;
  if (form === null) return { subject: message.subject, body: message.ownText };
  const free = Object.entries(form.fields)
    .filter(([name]) => {
      const closed = desk.fields.find((each) => each.form === form.id && each.field === name);
      return closed === undefined || fieldValueOf(message, closed) === 'other';
    })
    .map(([, value]) => value);
  return { subject: message.subject, body: free.join('\n\n') };
}

/** Neighbouring words, with the beginning and the end marked. */
function* pairsOf(words: readonly string[]): Iterable<string> {
  let previous = '^';
  for (const word of words) {
    yield `${previous} ${word}`;
    previous = word;
  }
  yield `${previous} $`;
}

/** Every four letters in a row of each word with a space on both sides; a word of one letter gives ` a `. */
function* gramsOf(words: readonly string[]): Iterable<string> {
  for (const word of words) {
    const padded = ` ${word} `;
    const last = Math.max(1, word.length - 1);
    for (let i = 0; i < last; i++) yield padded.slice(i, i + bounds.gramChars);
  }
}
