import type { Desk } from '../desk/desk.ts';
import type { Message } from '../message/message.ts';
import { foldText } from '../text/words.ts';
import type { Features, Schema } from './schema.ts';
import { tokenHex } from './schema.ts';
import { schemaFrom } from './schema-of.ts';
import { createSipHash } from './siphash.ts';
import { fieldValueOf, slotsOf } from './slots.ts';
import { sortTokens } from './sort-tokens.ts';
import { createTokenReader, type Texts } from './tokens.ts';

export interface Extractor {
  readonly schema: Schema;
  /** The same message gives the same features, whatever was read before. */
  extract(message: Message): Features;
  /** Token to its text, `<region id>:<10 hex digits>` to words, for explaining; only of this message. */
  words(message: Message): Map<string, string>;
}

/** Reads features as this desk declares them, with tokens hashed under its key.
 *  Throws TallypostError `token-key-length`. */
export function createExtractor(desk: Desk, tokenKey: Uint8Array): Extractor {
  const slots = slotsOf(desk);
  const schema = schemaFrom(
    slots.map((slot) => slot.schema),
    tokenKey,
  );
  const valueIndex = schema.slots.map((slot) => new Map(slot.values.map((value, index) => [value, index])));
  const readTokens = createTokenReader(createSipHash(tokenKey));

  return {
    schema,
    extract(message) {
      const { body } = textsOf(message, desk);
      const folded = foldedTextsOf(message, desk);
      const input = { message, text: body, foldedText: `${folded.subject}\n${folded.body}` };
      const values = slots.map((slot, index) => valueIndex[index]!.get(slot.read(input)) ?? 1);
      const { regions, lengths } = readTokens(folded, false);
      // One piece of memory for all: each costs the time of some twenty tokens, and as much to give back.
      const all = new Float64Array(lengths.reduce((sum, length) => sum + length, 0));
      let from = 0;
      const sorted = regions.map((tokens, region) => {
        const length = lengths[region]!;
        const own = all.subarray(from, from + length);
        from += length;
        return sortTokens(tokens, length, own);
      });
      return { schema: schema.id, slots: values, regions: sorted };
    },
    words(message) {
      const { regions, texts } = readTokens(foldedTextsOf(message, desk), true);
      const words = new Map<string, string>();
      texts.forEach((all, region) => {
        const { id } = schema.regions[region]!;
        all.forEach((text, i) => {
          words.set(`${id}:${tokenHex(regions[region]![i]!)}`, text);
        });
      });
      return words;
    },
  };
}

function foldedTextsOf(message: Message, desk: Desk): Texts {
  const { subject, body } = textsOf(message, desk);
  const hasMore = message.form === null && message.text !== message.ownText;
  return {
    subject: foldText(subject),
    body: foldText(body),
    whole: hasMore ? foldText(message.text) : '',
  };
}

/** What is this writer's: of a mail its subject and what was written anew; of a form every field that is not a
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
