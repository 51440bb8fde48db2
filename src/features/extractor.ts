import type { Desk } from '../desk/desk.ts';
import type { Message } from '../message/message.ts';
import { foldText } from '../text/words.ts';
import type { Features, Schema } from './schema.ts';
import { tokenHex } from './schema.ts';
import { schemaFrom } from './schema-of.ts';
import { createSipHash } from './siphash.ts';
import { fieldValueOf, slotsOf } from './slots.ts';
import { sortTokens } from './sort-tokens.ts';
import { createTokenReader } from './tokens.ts';

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
  const scratch = new Float64Array(Math.max(...schema.regions.map((region) => region.tokensMax)));

  return {
    schema,
    extract(message) {
      const { subject, body } = textsOf(message, desk);
      const folded = [foldText(subject), foldText(body)] as const;
      const input = { message, text: body, foldedText: folded.join('\n') };
      const values = slots.map((slot, index) => valueIndex[index]!.get(slot.read(input)) ?? 1);
      const { regions } = readTokens(...folded, false);
      return {
        schema: schema.id,
        slots: values,
        regions: regions.map((tokens) => sortTokens(tokens, scratch)),
      };
    },
    words(message) {
      const { subject, body } = textsOf(message, desk);
      const { regions, texts } = readTokens(foldText(subject), foldText(body), true);
      const words = new Map<string, string>();
      regions.forEach((tokens, region) => {
        const { id } = schema.regions[region]!;
        tokens.forEach((token, i) => {
          words.set(`${id}:${tokenHex(token)}`, texts[region]![i]!);
        });
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
