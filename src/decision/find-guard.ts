import { bounds } from '../bounds.ts';
import { choiceOf, isUnder } from '../desk/comparison.ts';
import type { ClosedField, Desk, Guard } from '../desk/desk.ts';
import type { Address, Form, Message } from '../message/message.ts';
import { foldText, isUnspaced, wordsOf } from '../text/words.ts';

/** The first guard, in the desk's order, that this message meets; null when it meets none.
 *  Phrases are looked for in the subject and in what this writer wrote (of a form: in each field), as whole words in a
 *  row, NFKC and case folded, punctuation and line ends ignored. History quoted in a reply does not count: the desk's
 *  own advice ("if you smell gas …") would come back with every answer to it. */
export function findGuard(message: Message, desk: Desk): Guard | null {
  const texts = textsOf(message);
  let first = phraseGuard(texts, phrasesOf(desk));
  desk.guards.slice(0, first).some((guard, index) => {
    const isMet =
      guard.senders.some((sender) => isFrom(message.from, sender)) ||
      guard.fields.some((field) => isChosen(message.form, field));
    if (isMet) first = index;
    return isMet;
  });
  return desk.guards[first] ?? null;
}

function textsOf(message: Message): string[] {
  const { form } = message;
  return form === null
    ? [message.subject, message.ownText]
    : [message.subject, ...Object.values(form.fields)];
}

function isFrom(from: Address | null, sender: string): boolean {
  if (from === null) return false;
  return sender.startsWith('@') ? isUnder(from.domain, sender.slice(1)) : from.address === sender;
}

function isChosen(form: Form | null, field: ClosedField): boolean {
  if (form === null || form.id !== field.form || !Object.hasOwn(form.fields, field.field)) return false;
  const choice = choiceOf(field, form.fields[field.field]);
  return field.values.includes(choice);
}

interface Phrases {
  /** First word to the phrases that begin with it. */
  readonly byFirstWord: ReadonlyMap<
    string,
    readonly { readonly words: readonly string[]; readonly guard: number }[]
  >;
  /** Finds any of these first words; null when they are too many for one expression. A text without any of them, and most
   *  are, need not be cut into words. */
  readonly firstWords: RegExp | null;
  /** Phrases of scripts without spaces: where their words are cut depends on the text around, so they are looked for
   *  as they stand. */
  readonly asTheyStand: readonly { readonly folded: string; readonly guard: number }[];
}

// A desk's phrases are folded once, not once a message.
const prepared = new WeakMap<Desk, Phrases>();

function phrasesOf(desk: Desk): Phrases {
  const known = prepared.get(desk);
  if (known !== undefined) return known;
  const byFirstWord = new Map<string, { words: string[]; guard: number }[]>();
  const asTheyStand: { folded: string; guard: number }[] = [];
  desk.guards.forEach(({ phrases }, guard) => {
    for (const phrase of phrases) {
      const folded = foldText(phrase);
      if (isUnspaced(folded)) {
        asTheyStand.push({ folded: folded.trim(), guard });
        continue;
      }
      const words = wordsOf(folded);
      const first = words[0]!;
      byFirstWord.set(first, [...(byFirstWord.get(first) ?? []), { words, guard }]);
    }
  });
  const phrases = { byFirstWord, firstWords: expressionOf([...byFirstWord.keys()]), asTheyStand };
  prepared.set(desk, phrases);
  return phrases;
}

/** Words hold letters, marks and digits only: nothing in them means anything to an expression. */
function expressionOf(words: readonly string[]): RegExp | null {
  const isShort = words.length > 0 && words.length <= bounds.firstWordsMax;
  return isShort ? new RegExp(`(?<![\\p{L}\\p{M}\\p{N}])(?:${words.join('|')})`, 'u') : null;
}

/** Index of the first guard whose phrase is in one of the texts; Infinity when there is none. */
function phraseGuard(texts: readonly string[], { byFirstWord, firstWords, asTheyStand }: Phrases): number {
  let first = Number.POSITIVE_INFINITY;
  if (byFirstWord.size === 0 && asTheyStand.length === 0) return first;
  for (const text of texts) {
    const folded = foldText(text);
    for (const phrase of asTheyStand) {
      if (phrase.guard < first && folded.includes(phrase.folded)) first = phrase.guard;
    }
    if (firstWords !== null && !firstWords.test(folded)) continue;
    const words = wordsOf(folded);
    words.forEach((word, at) => {
      for (const phrase of byFirstWord.get(word) ?? []) {
        if (phrase.guard < first && phrase.words.every((each, i) => each === words[at + i]))
          first = phrase.guard;
      }
    });
  }
  return first;
}
