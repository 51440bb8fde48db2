/** What a style says about whether a person can see the text. */
export interface Look {
  /** Red, green, blue in one number; -1 transparent, null unknown. */
  readonly color: number | null;
  /** null unknown, such as a picture. */
  readonly background: number | null;
  /** Letters too small to see. Inherited, but a descendant may set its own size. */
  readonly isTiny: boolean;
  readonly isInvisible: boolean;
  /** Pushed out of sight by its indent. */
  readonly isIndentedAway: boolean;
}

export const plainLook: Look = {
  color: 0x000000,
  background: 0xffffff,
  isTiny: false,
  isInvisible: false,
  isIndentedAway: false,
};

export type Declarations = Map<string, string>;

/** Properties that can make text unseen, and `white-space`; all others are passed over. */
const readProperties = new Set(
  'display content-visibility visibility opacity overflow overflow-x overflow-y height max-height width max-width position left top right bottom clip clip-path transform margin-left margin-top text-indent color -webkit-text-fill-color background background-color background-image font font-size white-space'.split(
    ' ',
  ),
);

/** Splits `name: value; …` and keeps the properties of interest; values lower-cased and trimmed. Linear. */
export function readDeclarations(style: string, into: Declarations = new Map()): Declarations {
  for (const item of style.split(';')) {
    const colon = item.indexOf(':');
    if (colon < 0) continue;
    const name = item.slice(0, colon).trim().toLowerCase();
    if (!readProperties.has(name)) continue;
    into.set(
      name,
      item
        .slice(colon + 1)
        .toLowerCase()
        .replace('!important', '')
        .trim(),
    );
  }
  return into;
}

/** True when nothing inside the element can be seen, whatever its descendants say. */
export function hidesContent(style: Declarations): boolean {
  if (style.size === 0) return false;
  const get = (name: string) => style.get(name) ?? '';
  if (get('display') === 'none' || get('content-visibility') === 'hidden') return true;
  const opacity = get('opacity');
  if (opacity !== '' && sizeOf(opacity, 1) <= 0.05) return true;
  const isClipped = /hidden|clip/.test(get('overflow') + get('overflow-y') + get('overflow-x'));
  if (isClipped && ['height', 'max-height', 'width', 'max-width'].some((n) => isNearZero(get(n))))
    return true;
  if (/absolute|fixed/.test(get('position'))) {
    if (['left', 'top', 'right', 'bottom'].some((n) => parseFloat(get(n)) <= -500)) return true;
    if (/rect\(\s*(?:0|1px)/.test(get('clip'))) return true;
  }
  if (['margin-left', 'margin-top'].some((n) => parseFloat(get(n)) <= -500)) return true;
  if (/inset\(\s*(?:100|50)%/.test(get('clip-path'))) return true;
  return /scale[xy]?\(\s*0(?:\.0+)?\s*[,)]/.test(get('transform'));
}

/** The look of an element from that of its parent and its own declarations. */
export function lookOf(parent: Look, style: Declarations): Look {
  if (style.size === 0) return parent;
  let { color, background, isTiny, isInvisible, isIndentedAway } = parent;
  const ownBackground = style.get('background-color') ?? style.get('background');
  if (ownBackground !== undefined && !/^(?:none|inherit|initial|unset)?$/.test(ownBackground)) {
    const parsed = readColor(ownBackground);
    // Transparent shows what lies behind.
    if (parsed !== -1) background = parsed;
  }
  if (/url\(|gradient/.test(style.get('background-image') ?? '')) background = null;
  const ownColor = style.get('-webkit-text-fill-color') ?? style.get('color');
  if (ownColor !== undefined && ownColor !== 'inherit') color = readColor(ownColor);
  const size = style.get('font-size') ?? sizeOfFont(style.get('font'));
  if (size !== undefined) isTiny = isTinySize(size, isTiny);
  const visibility = style.get('visibility');
  if (visibility !== undefined) isInvisible = /hidden|collapse/.test(visibility);
  const indent = style.get('text-indent');
  if (indent !== undefined) isIndentedAway = parseFloat(indent) <= -500;
  return { color, background, isTiny, isInvisible, isIndentedAway };
}

/** True when text of this look cannot be seen. */
export function isUnseen(look: Look): boolean {
  if (look.isTiny || look.isInvisible || look.isIndentedAway || look.color === -1) return true;
  if (look.color === null || look.background === null) return false;
  return areAlike(look.color, look.background);
}

/** Channels that differ by at most 24 of 255 cannot be told apart as text. */
function areAlike(a: number, b: number): boolean {
  for (const shift of [0, 8, 16]) {
    if (Math.abs(((a >> shift) & 0xff) - ((b >> shift) & 0xff)) > 24) return false;
  }
  return true;
}

function isNearZero(value: string): boolean {
  return value !== '' && sizeOf(value, 16) <= 1;
}

/** A CSS length in pixels; `whole` is what 1em or 100% stands for. NaN when unreadable. */
function sizeOf(value: string, whole: number): number {
  const number = parseFloat(value);
  if (value.endsWith('%')) return (number / 100) * whole;
  if (/[^x](?:em|ex|ch)$/.test(value)) return number * whole;
  return number;
}

function isTinySize(size: string, inherited: boolean): boolean {
  if (size === 'inherit') return inherited;
  const pixels = sizeOf(size, 16);
  // Words such as `small` and sizes relative to a tiny parent are read as visible.
  return pixels <= 2;
}

/** The size inside the `font` shorthand: the part before `/` or the first length. */
function sizeOfFont(font: string | undefined): string | undefined {
  if (font === undefined) return undefined;
  return (
    /(?:^|\s)(\d{0,6}\.?\d{0,6}(?:px|pt|em|rem|%)?)(?:\/|\s|$)/.exec(font.slice(0, 200))?.[1] || undefined
  );
}

const namedColors: Readonly<Record<string, number>> = {
  white: 0xffffff,
  snow: 0xfffafa,
  ivory: 0xfffff0,
  ghostwhite: 0xf8f8ff,
  whitesmoke: 0xf5f5f5,
  floralwhite: 0xfffaf0,
  mintcream: 0xf5fffa,
  azure: 0xf0ffff,
  aliceblue: 0xf0f8ff,
  honeydew: 0xf0fff0,
  seashell: 0xfff5ee,
  black: 0x000000,
  red: 0xff0000,
  green: 0x008000,
  blue: 0x0000ff,
  navy: 0x000080,
  gray: 0x808080,
  grey: 0x808080,
  silver: 0xc0c0c0,
  yellow: 0xffff00,
  transparent: -1,
};

/** A CSS color (CSS Color 4: hex, rgb(), hsl(), the names above): -1 transparent, null when not understood. */
export function readColor(value: string): number | null {
  const text = value.trim().slice(0, 100);
  if (/url\(|gradient/.test(text)) return null;
  const hex = /#([0-9a-f]{3,8})\b/.exec(text)?.[1];
  if (hex !== undefined) return readHex(hex);
  const call = /(rgb|hsl)a?\(([^)]*)\)/.exec(text);
  if (call) return readFunction(call[1]!, call[2]!);
  const name = /^[a-z]+/.exec(text)?.[0] ?? '';
  return Object.hasOwn(namedColors, name) ? namedColors[name]! : null;
}

function readHex(hex: string): number | null {
  const isShort = hex.length === 3 || hex.length === 4;
  if (!isShort && hex.length !== 6 && hex.length !== 8) return null;
  const full = isShort ? [...hex].map((digit) => digit + digit).join('') : hex;
  if (full.length === 8 && parseInt(full.slice(6), 16) <= 0x1a) return -1;
  return parseInt(full.slice(0, 6), 16);
}

function readFunction(name: string, list: string): number | null {
  const items = list.split(/[\s,/]+/).filter((item) => item !== '');
  if (items.length < 3) return null;
  const alpha = items[3] === undefined ? 1 : sizeOf(items[3], 1);
  if (alpha <= 0.1) return -1;
  if (name === 'rgb') {
    const [r, g, b] = items.map((item) => Math.min(255, Math.max(0, Math.round(sizeOf(item, 255)))));
    return Number.isNaN(r! + g! + b!) ? null : (r! << 16) | (g! << 8) | b!;
  }
  return readHsl(parseFloat(items[0]!), parseFloat(items[1]!) / 100, parseFloat(items[2]!) / 100);
}

/** CSS Color 4 section 7: hue in degrees, saturation and lightness from 0 to 1. */
function readHsl(hue: number, saturation: number, lightness: number): number | null {
  if (Number.isNaN(hue + saturation + lightness)) return null;
  const amplitude = saturation * Math.min(lightness, 1 - lightness);
  const channel = (n: number) => {
    const k = (n + hue / 30) % 12;
    return Math.round(255 * (lightness - amplitude * Math.max(-1, Math.min(k - 3, 9 - k, 1))));
  };
  return (channel(0) << 16) | (channel(8) << 8) | channel(4);
}
