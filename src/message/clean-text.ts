import type { Defects } from './defects.ts';

const plain = /^[\t\n\x20-\x7e]*$/;
/** C0 and C1 controls but tab and line feed; U+FFFE and U+FFFF; lone surrogates are handled apart. */
const controls = /[^\P{Cc}\t\n]|[\ufffe\uffff]/gu;
/** Overrides that show text in another order than it is stored (UAX #9: LRO, RLO). */
const overrides = /[\u202d\u202e]+/g;
/** Directional marks that ordinary Arabic and Hebrew mail is full of (UAX #9): meaningless to words. */
const directionMarks = /[\u061c\u200e\u200f\u202a-\u202c\u2066-\u2069]+/g;
/** Characters without a shape that split or lengthen words unseen: zero width spaces, soft hyphens, Hangul fillers, tags
 *  and the rest of Unicode's Default_Ignorable_Code_Point. Joiners stay: Persian and Hindi spell with them. */
const invisibles = /(?!\u200c|\u200d|[\ufe00-\ufe0f])\p{DI}/gu;
/** Variation selectors: the colour of an emoji. */
const variations = /[\ufe00-\ufe0f]+/g;
/** More combining marks on one letter than any language writes. */
const markPile = /(\p{M}{4})\p{M}+/gu;
const loneSurrogates = /\p{Surrogate}/gu;
const wideSpaces = /[\u00a0\u1680\u2000-\u200a\u202f\u205f\u3000]/g;
const lineSeparators = /\r\n?|[\u0085\u2028\u2029\v\f]/g;
/** Latin beside Cyrillic or Greek inside one word: letters that look alike. */
const mixedScripts =
  /\p{Script=Latin}\p{M}*[\p{Script=Cyrillic}\p{Script=Greek}]|[\p{Script=Cyrillic}\p{Script=Greek}]\p{M}*\p{Script=Latin}/u;

/** Text of several lines as a person sees it: without controls, direction overrides and invisible characters, each on
 *  record; spaces of all widths become plain ones. Linear. */
export function cleanText(text: string, place: string, defects: Defects): string {
  if (plain.test(text)) return text;
  let clean = text.replace(lineSeparators, '\n');
  const strip = (pattern: RegExp, code: Parameters<Defects['add']>[0] | null) => {
    const stripped = clean.replace(pattern, '');
    if (stripped.length === clean.length) return;
    clean = stripped;
    if (code !== null) defects.add(code, place);
  };
  strip(controls, 'control-characters');
  if (plain.test(clean)) return clean;
  clean = clean.replace(wideSpaces, ' ').replace(loneSurrogates, '');
  strip(overrides, 'direction-override');
  strip(directionMarks, null);
  strip(invisibles, 'invisible-characters');
  strip(variations, null);
  const thinned = clean.replace(markPile, '$1');
  if (thinned.length !== clean.length) {
    defects.add('invisible-characters', place);
    clean = thinned;
  }
  if (mixedScripts.test(clean)) defects.add('mixed-script-word', place);
  return clean;
}

/** One line: as cleanText, with all white space folded into single spaces. A line break or tab that an encoded word or a
 *  form value carried into a header is on record. */
export function cleanLine(text: string, place: string, defects: Defects): string {
  if (/[\r\n\v\f\u0085\u2028\u2029]/.test(text)) defects.add('line-break-in-header', place);
  return cleanText(text, place, defects).replace(/\s+/g, ' ').trim();
}

/** Cuts at a number of UTF-16 units, never inside a character; at the last white space when one is near. */
export function cutText(text: string, charsMax: number): string {
  if (text.length <= charsMax) return text;
  const head = text.slice(0, charsMax).replace(/[\ud800-\udbff]$/, '');
  const space = head.search(/\s\S{0,40}$/);
  return space > 0 ? head.slice(0, space) : head;
}
