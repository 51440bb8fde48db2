import type { ReferencePattern } from './desk.ts';

/** Whether folded text holds a reference of the declared shape, not inside a longer word or number.
 *  The shape has a fixed length and no repetition, so the search is linear in the text. */
export type ReferenceMatcher = (foldedText: string) => boolean;

/** `#` matches one ASCII digit, `@` one letter, anything else itself. The text must be folded (NFKC, lower case);
 *  the pattern's own letters are lower-cased to match. */
export function matcherOf(reference: ReferencePattern): ReferenceMatcher {
  const shape = [...reference.pattern.normalize('NFKC').toLowerCase()].map(shapeOf).join('');
  const expression = new RegExp(`(?<![\\p{L}\\p{N}])${shape}(?![\\p{L}\\p{N}])`, 'u');
  return (foldedText) => expression.test(foldedText);
}

function shapeOf(character: string): string {
  if (character === '#') return '[0-9]';
  if (character === '@') return '\\p{L}';
  return /[\p{L}\p{N}]/u.test(character) ? character : `\\u{${character.codePointAt(0)?.toString(16)}}`;
}
