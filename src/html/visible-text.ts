/** Code points that change how other text looks, or cannot be seen (controls, format characters, line separators, fillers):
 *  shown by name, so that nothing on a page says something other than its letters. Line feed and tab stay, and the two
 *  joiners, which scripts need. General categories as in the Unicode Standard, section 4.5. */
const hidden = /(?![\n\t\u200c\u200d])[\p{Cc}\p{Cf}\p{Zl}\p{Zp}\u115f\u1160\u3164\uffa0]/gu;

const names: Readonly<Record<number, string>> = {
  173: 'soft hyphen',
  1564: 'Arabic mark',
  8203: 'zero-width space',
  8206: 'left-to-right mark',
  8207: 'right-to-left mark',
  8234: 'left-to-right embedding',
  8235: 'right-to-left embedding',
  8236: 'end of direction',
  8237: 'left-to-right override',
  8238: 'right-to-left override',
  8294: 'left-to-right isolate',
  8295: 'right-to-left isolate',
  8296: 'isolate',
  8297: 'end of isolate',
  65279: 'byte order mark',
};

/** The text cut where something hidden stands; `name` says what it was. */
export interface VisiblePiece {
  readonly text: string;
  readonly isName: boolean;
}

/** Splits text into what can be shown as it is and names of what cannot. */
export function visiblePieces(text: string): VisiblePiece[] {
  const pieces: VisiblePiece[] = [];
  let from = 0;
  for (const match of text.matchAll(hidden)) {
    if (match.index > from) pieces.push({ text: text.slice(from, match.index), isName: false });
    const code = match[0].codePointAt(0) as number;
    pieces.push({
      text: names[code] ?? `U+${code.toString(16).toUpperCase().padStart(4, '0')}`,
      isName: true,
    });
    from = match.index + match[0].length;
  }
  if (from < text.length) pieces.push({ text: text.slice(from), isName: false });
  return pieces;
}

/** For one line, such as a subject: hidden code points left out, white space folded. */
export function plainLine(text: string, charsMax: number): string {
  const line = text.replace(hidden, '').replace(/\s+/g, ' ').trim();
  return line.length <= charsMax ? line : `${line.slice(0, charsMax - 1).replace(/[\ud800-\udbff]$/, '')}…`;
}
