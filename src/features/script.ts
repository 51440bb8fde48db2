/** Scripts told apart; Han together with kana is Japanese and counts as `kana`. Anything else is `other`. */
export const scripts = [
  'latin',
  'greek',
  'cyrillic',
  'hebrew',
  'arabic',
  'devanagari',
  'thai',
  'hangul',
  'kana',
  'han',
] as const;

/** First and last code unit of the main blocks of each script behind ASCII (Unicode 15, Blocks.txt), ascending. */
const blocks: readonly (readonly [number, number, (typeof scripts)[number]])[] = [
  [0xc0, 0x24f, 'latin'],
  [0x370, 0x3ff, 'greek'],
  [0x400, 0x52f, 'cyrillic'],
  [0x590, 0x5ff, 'hebrew'],
  [0x600, 0x6ff, 'arabic'],
  [0x750, 0x77f, 'arabic'],
  [0x900, 0x97f, 'devanagari'],
  [0xe00, 0xe7f, 'thai'],
  [0x1100, 0x11ff, 'hangul'],
  [0x1e00, 0x1eff, 'latin'],
  [0x1f00, 0x1fff, 'greek'],
  [0x3040, 0x30ff, 'kana'],
  [0x3400, 0x9fff, 'han'],
  [0xac00, 0xd7af, 'hangul'],
];
const sampleChars = 1024;
/** Japanese text is rarely less than a third kana; a Chinese text with a Japanese name stays below this. */
const kanaShareMin = 0.1;

const notAscii = /[^\0-\x7f]/;
const latinLetter = /[A-Za-z]/;

/** The script that most letters of the text's beginning are written in; `missing` without letters of any. */
export function scriptOf(text: string): string {
  const to = Math.min(text.length, sampleChars);
  const sample = text.slice(0, to);
  if (!notAscii.test(sample)) return latinLetter.test(sample) ? 'latin' : 'missing';
  const counts = new Map<string, number>();
  let latin = 0;
  for (let i = 0; i < to; i++) {
    const unit = text.charCodeAt(i);
    if (unit < 0x80) {
      const letter = unit | 0x20;
      if (letter >= 0x61 && letter <= 0x7a) latin += 1;
      continue;
    }
    const script = scriptOfUnit(unit);
    if (script !== null) counts.set(script, (counts.get(script) ?? 0) + 1);
  }
  counts.set('latin', (counts.get('latin') ?? 0) + latin);
  const kana = counts.get('kana') ?? 0;
  const han = counts.get('han') ?? 0;
  if (kana > 0 && kana >= kanaShareMin * (kana + han)) {
    counts.set('kana', kana + han);
    counts.delete('han');
  }
  let best = 'missing';
  let most = 0;
  // In the list's order, so that a tie does not depend on the text's order.
  for (const script of [...scripts, 'other']) {
    const count = counts.get(script) ?? 0;
    if (count > most) [best, most] = [script, count];
  }
  return best;
}

function scriptOfUnit(unit: number): string | null {
  for (const [first, last, script] of blocks) {
    if (unit < first) break;
    if (unit <= last) return script;
  }
  // Digits, punctuation and spaces of all blocks; letters elsewhere are of another script.
  return unit > 0x24f && /\p{L}/u.test(String.fromCharCode(unit)) ? 'other' : null;
}
