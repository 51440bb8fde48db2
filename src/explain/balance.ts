import type { EvidencePart } from '../model/posterior.ts';
import { describeSlot } from './slot-words.ts';
import { type WordEvidence, wordEvidence } from './word-evidence.ts';

/** Ten times the decimal logarithm: 10 decibans are odds of ten to one. I. J. Good, Probability and the Weighing of
 *  Evidence (1950), section 6.4, who credits A. M. Turing. */
export const decibansPerNat = 10 / Math.LN10;

export type EvidenceKind = 'volume' | 'circumstance' | 'word' | 'absence';

/** One thing that speaks for the queue (above 0) or for its rival (below 0). */
export interface Evidence {
  readonly kind: EvidenceKind;
  /** What a person reads: a word of the message, or a circumstance in words. */
  readonly label: string;
  /** Slot id for a circumstance; else empty. */
  readonly slot: string;
  readonly decibans: number;
}

export interface EvidenceGroup {
  readonly kind: EvidenceKind;
  readonly title: string;
  readonly decibans: number;
  /** Strongest first, whichever way it speaks. */
  readonly items: readonly Evidence[];
}

/** What speaks for one queue against another. */
export interface Balance {
  readonly queue: string;
  readonly rival: string;
  /** Log odds of queue against rival; the sum of the groups, and of all their items, but for rounding. */
  readonly decibans: number;
  readonly groups: readonly EvidenceGroup[];
}

const titles: Readonly<Record<EvidenceKind, string>> = {
  word: 'Words in the message',
  absence: 'Words that are not there',
  circumstance: 'How it came',
  volume: 'How much mail each queue gets',
};

/** The balance between two queues from all parts of the log posterior. What the parts say of all queues alike cancels, so
 *  that the sum is log P(queue | x) - log P(rival | x) without a remainder. Against all other queues together no such sum
 *  exists: a part's weight would depend on the order in which parts are read.
 *  `queues` in the order of the parts' scores; `words` as the extractor gives them for this message. */
export function weighEvidence(
  parts: readonly EvidencePart[],
  queues: readonly string[],
  queue: string,
  rival: string,
  words: ReadonlyMap<string, string>,
): Balance {
  const [a, b] = [queues.indexOf(queue), queues.indexOf(rival)];
  const decibansOf = (part: EvidencePart) => (part.score[a]! - part.score[b]!) * decibansPerNat;
  const items: Evidence[] = [];
  const tokens: EvidencePart[] = [];
  let volume = 0;
  let absence = 0;
  // A mail has chosen nothing in each field of every form: one circumstance, not twenty.
  let unchosen = 0;
  for (const part of parts) {
    if (part.kind === 'token') tokens.push(part);
    else if (part.kind === 'absent') absence += decibansOf(part);
    else if (part.kind === 'slot' && part.place.startsWith('field:') && part.value === 'missing') {
      unchosen += decibansOf(part);
    } else if (part.kind === 'slot') {
      const label = describeSlot(part.place, part.value);
      items.push({ kind: 'circumstance', label, slot: part.place, decibans: decibansOf(part) });
    } else volume += decibansOf(part);
  }
  items.push({
    kind: 'circumstance',
    label: 'nothing chosen in other fields of forms',
    slot: '',
    decibans: unchosen,
  });
  items.push({
    kind: 'volume',
    label: `messages of ${queue} and of ${rival} so far`,
    slot: '',
    decibans: volume,
  });
  items.push({ kind: 'absence', label: 'words that such messages often hold', slot: '', decibans: absence });
  for (const word of wordEvidence(tokens, words, decibansOf)) items.push(asItem(word));
  const groups = (['word', 'circumstance', 'absence', 'volume'] as const).map((kind) => groupOf(kind, items));
  return { queue, rival, decibans: sum(groups), groups: groups.filter((group) => group.items.length > 0) };
}

function asItem({ word, decibans }: WordEvidence): Evidence {
  return { kind: 'word', label: word, slot: '', decibans };
}

function groupOf(kind: EvidenceKind, all: readonly Evidence[]): EvidenceGroup {
  const items = all
    .filter((item) => item.kind === kind && item.decibans !== 0)
    .sort((x, y) => Math.abs(y.decibans) - Math.abs(x.decibans) || (x.label < y.label ? -1 : 1));
  return { kind, title: titles[kind], decibans: sum(items), items };
}

function sum(of: readonly { readonly decibans: number }[]): number {
  return of.reduce((total, each) => total + each.decibans, 0);
}
