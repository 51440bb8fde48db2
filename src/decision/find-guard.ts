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

/** Phrases by their words: a text costs its own length times the longest phrase, however many begin alike. */
interface Branch {
  /** First guard with a phrase that ends here; Infinity when none does. */
  guard: number;
  readonly next: Map<string, Branch>;
}

interface Phrases {
  readonly root: Branch;
  /** Finds whatever may be a phrase, and more; null when phrases are too many for one expression. A text in which it finds
   *  nothing, and most are, need not be cut into words. */
  readonly candidates: RegExp | null;
  /** Phrases of scripts without spaces: where their words are cut depends on the text around, so they are looked for
   *  as they stand. */
  readonly asTheyStand: readonly { readonly folded: string; readonly guard: number }[];
}

/** Of longer words in a text only the beginning counts, and more letters follow it there. */
const plainWord = new RegExp(`^[a-z0-9]{1,${bounds.wordCharsMax - 1}}$`);

// A desk's phrases are folded once, not once a message.
const prepared = new WeakMap<Desk, Phrases>();

function phrasesOf(desk: Desk): Phrases {
  const known = prepared.get(desk);
  if (known !== undefined) return known;
  const root: Branch = { guard: Number.POSITIVE_INFINITY, next: new Map() };
  const asTheyStand: { folded: string; guard: number }[] = [];
  desk.guards.forEach(({ phrases }, guard) => {
    for (const phrase of phrases) {
      const folded = foldText(phrase);
      if (isUnspaced(folded)) asTheyStand.push({ folded: folded.trim(), guard });
      else addPhrase(root, wordsOf(folded), guard);
    }
  });
  const phrases = { root, candidates: candidatesOf(root), asTheyStand };
  prepared.set(desk, phrases);
  return phrases;
}

function addPhrase(root: Branch, words: readonly string[], guard: number): void {
  let branch = root;
  for (const word of words) {
    let next = branch.next.get(word);
    if (next === undefined) {
      next = { guard: Number.POSITIVE_INFINITY, next: new Map() };
      branch.next.set(word, next);
    }
    branch = next;
  }
  branch.guard = Math.min(branch.guard, guard);
}

/** The words of each phrase as letters in a row, between words anything but plain letters and digits. Words hold letters, marks
 *  and digits only: nothing in them means anything to an expression. A phrase counts up to its first word with another letter,
 *  since that would match what stands between words, and a search must not go back. */
function candidatesOf(root: Branch): RegExp | null {
  let phrases = 0;
  const expressionOf = (branch: Branch): string => {
    const tails = [...branch.next].filter(([word]) => plainWord.test(word));
    const isOpen = branch.guard !== Number.POSITIVE_INFINITY || tails.length < branch.next.size;
    if (isOpen || tails.length === 0) {
      phrases += 1;
      return '';
    }
    return `[^a-z0-9]+(?:${tails.map(([word, next]) => word + expressionOf(next)).join('|')})`;
  };
  const all = [...root.next].map(([word, next]) => word + (plainWord.test(word) ? expressionOf(next) : ''));
  if (all.length === 0 || phrases > bounds.guardPhrasesMax || all.length > bounds.guardPhrasesMax)
    return null;
  return new RegExp(all.join('|'));
}

/** Index of the first guard whose phrase is in one of the texts; Infinity when there is none. */
function phraseGuard(texts: readonly string[], { root, candidates, asTheyStand }: Phrases): number {
  let first = Number.POSITIVE_INFINITY;
  if (root.next.size === 0 && asTheyStand.length === 0) return first;
  for (const text of texts) {
    const folded = foldText(text);
    for (const phrase of asTheyStand) {
      if (phrase.guard < first && folded.includes(phrase.folded)) first = phrase.guard;
    }
    if (root.next.size === 0 || (candidates !== null && !candidates.test(folded))) continue;
    const words = wordsOf(folded);
    for (let at = 0; at < words.length; at++) first = Math.min(first, guardAt(root, words, at));
  }
  return first;
}

function guardAt(root: Branch, words: readonly string[], at: number): number {
  let first = Number.POSITIVE_INFINITY;
  let branch = root.next.get(words[at]!);
  for (let i = at + 1; branch !== undefined; i++) {
    first = Math.min(first, branch.guard);
    branch = i < words.length ? branch.next.get(words[i]!) : undefined;
  }
  return first;
}
