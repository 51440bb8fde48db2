import { describe, expect, test } from 'vitest';
import {
  hidesContent,
  isUnseen,
  lookOf,
  plainLook,
  readColor,
  readDeclarations,
} from '../../src/message/style.ts';

describe('colours (CSS Color 4)', () => {
  const colors: [value: string, color: number | null][] = [
    ['#fff', 0xffffff],
    ['#FFFFFF', null],
    ['#12ab34', 0x12ab34],
    ['#12ab34ff', 0x12ab34],
    ['#12ab3400', -1],
    ['#fff0', -1],
    ['rgb(1, 2, 3)', 0x010203],
    ['rgb(1 2 3 / 50%)', 0x010203],
    ['rgb(100%,0%,0%)', 0xff0000],
    ['rgb(300,-5,0)', 0xff0000],
    ['rgba(0,0,0,0)', -1],
    // Section 7.1: hue 120 at full saturation and half lightness is lime.
    ['hsl(120,100%,50%)', 0x00ff00],
    ['hsl(0,0%,100%)', 0xffffff],
    ['hsl(240deg 100% 25%)', 0x000080],
    ['white', 0xffffff],
    ['transparent', -1],
    ['url(x.png) white', null],
    ['linear-gradient(white,white)', null],
    ['var(--x)', null],
    ['nonsense', null],
    ['', null],
    ['rgb(a,b,c)', null],
    ['#12345', null],
  ];
  // Values reach readColor in lower case; capitals are not understood here.
  test.each(colors)('%s is %s', (value, color) => {
    expect(readColor(value)).toBe(color);
  });
});

describe('what hides everything inside', () => {
  const cases: [style: string, isHiding: boolean][] = [
    ['display:none', true],
    ['display : None !important', true],
    ['display:block', false],
    ['opacity:0', true],
    ['opacity:4%', true],
    ['opacity:.9', false],
    ['height:0;overflow:hidden', true],
    ['height:0', false],
    ['max-width:1px;overflow:hidden', true],
    ['position:absolute;left:-5000px', true],
    ['position:relative;left:-5px', false],
    ['margin-left:-9999px', true],
    ['clip-path:inset(100%)', true],
    ['transform:scale(0)', true],
    ['transform:scale(0.5)', false],
    ['visibility:hidden', false],
    ['', false],
    [';;:;x', false],
  ];
  test.each(cases)('%j: %s', (style, isHiding) => {
    expect(hidesContent(readDeclarations(style))).toBe(isHiding);
  });
});

describe('what cannot be seen', () => {
  const look = (...styles: string[]) =>
    styles.reduce((parent, style) => lookOf(parent, readDeclarations(style)), plainLook);
  const cases: [styles: string[], isHidden: boolean][] = [
    [[], false],
    [['color:#fff'], true],
    [['color:#e8e8e8'], true],
    [['color:#ccc'], false],
    [['background:#000', 'color:#fff'], false],
    [['background:#000'], true],
    [['background-color:#fff0', 'color:#fff'], true],
    [['background:url(a.png)', 'color:#fff'], false],
    [['font-size:0'], true],
    [['font-size:1px'], true],
    [['font-size:0.1em'], true],
    [['font-size:0', 'font-size:14px'], false],
    [['font-size:0', 'color:red'], true],
    [['font:12px/20px serif'], false],
    [['font:0/0 a'], true],
    [['visibility:hidden'], true],
    [['visibility:hidden', 'visibility:visible'], false],
    [['text-indent:-9999px'], true],
    [['color:transparent'], true],
    [['color:var(--x)'], false],
  ];
  test.each(cases)('%j: %s', (styles, isHidden) => {
    expect(isUnseen(look(...styles))).toBe(isHidden);
  });
});
