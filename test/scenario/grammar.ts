import type { Chance } from './random.ts';

/** Words for the holes of a template; a function where a word must be made up each time. */
export type Lexicon = Readonly<Record<string, readonly string[] | ((chance: Chance) => string)>>;

/** Writes one sentence: `{hole}` takes a word of the lexicon, `(a|b|)` takes one of the choices; both may nest.
 *  `given` fills holes that must stay the same in one letter (the writer's name, the account). */
export function writeSentence(
  template: string,
  lexicon: Lexicon,
  given: Readonly<Record<string, string>>,
  chance: Chance,
): string {
  let text = template;
  for (let round = 0; round < 60; round += 1) {
    const choice = /\(([^()|]*(?:\|[^()|]*)+)\)/.exec(text);
    if (choice) {
      text = splice(text, choice, chance.pick((choice[1] as string).split('|')));
      continue;
    }
    const hole = /\{([a-z-]+)\}/i.exec(text);
    if (!hole) break;
    text = splice(text, hole, wordFor(hole[1] as string, lexicon, given, chance));
  }
  return text
    .replace(/ {2,}/g, ' ')
    .replace(/ ([.,;:?!])/g, '$1')
    .trim();
}

function splice(text: string, match: RegExpExecArray, replacement: string): string {
  return text.slice(0, match.index) + replacement + text.slice(match.index + match[0].length);
}

function wordFor(
  name: string,
  lexicon: Lexicon,
  given: Readonly<Record<string, string>>,
  chance: Chance,
): string {
  if (given[name] !== undefined) return given[name];
  const words = lexicon[name];
  if (words === undefined) throw new Error(`no words for {${name}}`);
  return typeof words === 'function' ? words(chance) : chance.pick(words);
}

// biome-ignore format: one keyboard, one table
const neighbours: Readonly<Record<string, string>> = {
  a: 's', e: 'r', i: 'o', o: 'p', t: 'y', n: 'm', r: 't', s: 'd', l: 'k', d: 'f', u: 'i', m: 'n', c: 'v', h: 'j',
};

/** Slips of the finger: two letters exchanged, one dropped, doubled or hit beside. Digits are left alone. */
export function addTypos(text: string, share: number, chance: Chance): string {
  return text.replace(/\p{L}{4,}/gu, (word) => {
    if (!chance.isTrue(share)) return word;
    const at = 1 + chance.below(word.length - 2);
    const here = word[at] as string;
    switch (chance.below(4)) {
      case 0:
        return word.slice(0, at) + word[at + 1] + here + word.slice(at + 2);
      case 1:
        return word.slice(0, at) + word.slice(at + 1);
      case 2:
        return word.slice(0, at) + here + word.slice(at);
      default:
        return word.slice(0, at) + (neighbours[here] ?? here) + word.slice(at + 1);
    }
  });
}
