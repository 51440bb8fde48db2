import { Tokenizer, type TokenizerCallbacks } from 'htmlparser2';
import { bounds } from '../bounds.ts';
import type { Defects } from './defects.ts';
import { isQuotation, isSignature, opensHistory } from './html-quotes.ts';
import {
  type Declarations,
  hidesContent,
  isUnseen,
  type Look,
  lookOf,
  plainLook,
  readDeclarations,
} from './style.ts';
import { StyleSheet } from './style-sheet.ts';

/** A run of text and whether the mail client marked it as not this writer's own. */
export interface Segment {
  readonly text: string;
  readonly isQuoted: boolean;
}

export interface HtmlText {
  readonly segments: readonly Segment[];
  /** Letters and other marks left out because nobody could see them. */
  readonly hiddenChars: number;
}

interface Frame {
  readonly name: string;
  readonly look: Look;
  readonly isHidden: boolean;
  /** Inside scripts, titles and the like: no attempt to hide something from the reader. */
  readonly isUnshown: boolean;
  readonly isQuoted: boolean;
  readonly isPre: boolean;
}

interface OwnStyle {
  readonly declarations: Declarations;
  readonly isHiding: boolean;
  readonly isPre: boolean;
}

const noStyle: OwnStyle = { declarations: new Map(), isHiding: false, isPre: false };
/** Attributes that bear on style, in the order of the key. */
const styleAttributes = ['style', 'class', 'id', 'color', 'text', 'bgcolor', 'background'] as const;

const outermost: Frame = {
  name: '',
  look: plainLook,
  isHidden: false,
  isUnshown: false,
  isQuoted: false,
  isPre: false,
};

const voidElements = new Set(
  'area base br col embed hr img input link meta param source track wbr'.split(' '),
);
/** Content that is never shown as text. */
const unshownElements = new Set(
  'head title style script template object applet iframe noembed noframes svg math audio video canvas select datalist textarea map'.split(
    ' ',
  ),
);
const blockElements = new Set(
  'address article aside blockquote body center dd details dialog dir div dl dt fieldset figcaption figure footer form h1 h2 h3 h4 h5 h6 header hr html legend li main menu nav ol p pre section summary table tbody tfoot thead tr ul'.split(
    ' ',
  ),
);
/** Elements after which a blank line stands. */
const paragraphElements = new Set('p h1 h2 h3 h4 h5 h6 blockquote ul ol table pre'.split(' '));
/** An opening element closes these when they are the innermost open ones (HTML Living Standard, section 13.1.2.4). */
const closedByOpening = new Map<string, readonly string[]>([
  ['li', ['li']],
  ['dt', ['dt', 'dd']],
  ['dd', ['dt', 'dd']],
  ['tr', ['tr', 'td', 'th']],
  ['td', ['td', 'th']],
  ['th', ['td', 'th']],
  ['tbody', ['tr', 'td', 'th', 'tbody', 'thead']],
  ['option', ['option']],
]);
const readAttributes = new Set([
  'style',
  'class',
  'id',
  'hidden',
  'type',
  'cite',
  'color',
  'bgcolor',
  'text',
  'background',
]);

/** HTML to the text that a person sees, in one linear pass over the tokens. Scripts, comments and hidden elements are
 *  left out; quotations that mail clients mark come as segments of their own. */
export function readHtml(html: string, place: string, defects: Defects): HtmlText {
  const scanner = new HtmlScanner(html);
  const tokenizer = new Tokenizer({ decodeEntities: true }, scanner);
  tokenizer.write(html);
  tokenizer.end();
  if (scanner.isTooDeep) defects.add('html-depth-cut', place);
  if (scanner.isStyleCut) defects.add('style-cut', place);
  if (scanner.hiddenChars > 0) defects.add('hidden-text', place);
  return { segments: scanner.takeSegments(), hiddenChars: scanner.hiddenChars };
}

class HtmlScanner implements TokenizerCallbacks {
  hiddenChars = 0;
  isTooDeep = false;
  isStyleCut = false;
  readonly #html: string;
  readonly #sheet = new StyleSheet();
  readonly #stack: Frame[] = [outermost];
  readonly #openCounts = new Map<string, number>();
  /** Elements opened beyond the depth bound; their end tags must not close others. */
  #ignoredDepth = 0;
  #isHistory = false;
  #tag = '';
  #attributeName = '';
  #attributes = new Map<string, string>();
  #css = '';
  #styleChars = 0;
  #styles = new Map<string, OwnStyle>();

  readonly #segments: Segment[] = [];
  #out: string[] = [];
  #outIsQuoted = false;
  #breaks = 0;
  #hasSpace = false;
  #isEmpty = true;

  constructor(html: string) {
    this.#html = html;
  }

  get #top(): Frame {
    return this.#stack[this.#stack.length - 1]!;
  }

  // Tokens

  onopentagname(start: number, end: number): void {
    this.#tag = this.#html.slice(start, Math.min(end, start + 40)).toLowerCase();
    if (this.#attributes.size > 0) this.#attributes = new Map();
  }

  onattribname(start: number, end: number): void {
    const name = end - start > 10 ? '' : this.#html.slice(start, end).toLowerCase();
    this.#attributeName = readAttributes.has(name) && !this.#attributes.has(name) ? name : '';
    if (this.#attributeName !== '') this.#attributes.set(name, '');
  }

  onattribdata(start: number, end: number): void {
    if (this.#attributeName !== '') this.#extendAttribute(this.#html.slice(start, end));
  }

  onattribentity(codepoint: number): void {
    if (this.#attributeName !== '') this.#extendAttribute(String.fromCodePoint(codepoint));
  }

  onattribend(): void {
    this.#attributeName = '';
  }

  onopentagend(): void {
    this.#open(this.#tag);
  }

  onselfclosingtag(): void {
    this.#open(this.#tag);
  }

  onclosetag(start: number, end: number): void {
    this.#close(this.#html.slice(start, Math.min(end, start + 40)).toLowerCase());
  }

  ontext(start: number, end: number): void {
    this.#write(this.#html.slice(start, end));
  }

  ontextentity(codepoint: number): void {
    this.#write(String.fromCodePoint(codepoint));
  }

  oncdata(): void {}
  oncomment(): void {}
  ondeclaration(): void {}
  onprocessinginstruction(): void {}
  onend(): void {}

  // Elements

  #extendAttribute(text: string): void {
    const name = this.#attributeName;
    const value = this.#attributes.get(name) ?? '';
    const room = bounds.attributeCharsMax - value.length;
    if (text.length > room) this.isStyleCut = true;
    if (room > 0) this.#attributes.set(name, value + text.slice(0, room));
  }

  #open(name: string): void {
    if (name === 'br') {
      this.#breakLine(1, true);
      return;
    }
    if (blockElements.has(name)) {
      this.#breakLine(paragraphElements.has(name) ? 2 : 1);
      if (this.#openCounts.get('p') && this.#top.name === 'p') this.#pop();
    } else if (name === 'td' || name === 'th') this.#hasSpace = true;
    const closes = closedByOpening.get(name);
    if (closes !== undefined) while (closes.includes(this.#top.name)) this.#pop();
    if (voidElements.has(name)) return;
    if (this.#stack.length > bounds.htmlDepthMax) {
      this.isTooDeep = true;
      this.#ignoredDepth++;
      return;
    }
    this.#push(name);
  }

  #push(name: string): void {
    const parent = this.#top;
    const own = this.#styleOf(name);
    const classes = this.#attributes.get('class') ?? '';
    const id = this.#attributes.get('id') ?? '';
    const isUnshown = parent.isUnshown || unshownElements.has(name);
    if (opensHistory(classes, id)) this.#isHistory = true;
    this.#stack.push({
      name,
      look: lookOf(parent.look, own.declarations),
      isHidden: parent.isHidden || isUnshown || this.#attributes.has('hidden') || own.isHiding,
      isUnshown,
      isQuoted:
        parent.isQuoted || isQuotation(name, classes, id, this.#attributes) || isSignature(classes, id),
      isPre: parent.isPre || name === 'pre' || own.isPre,
    });
    this.#openCounts.set(name, (this.#openCounts.get(name) ?? 0) + 1);
  }

  /** The element's own style; worked out once for all elements that carry the same, as most do. */
  #styleOf(name: string): OwnStyle {
    const attributes = this.#attributes;
    const isLink = name === 'a';
    if (attributes.size === 0 && this.#sheet.isEmpty && !isLink) return noStyle;
    const key = [
      this.#sheet.isEmpty && !isLink ? '' : name,
      ...styleAttributes.map((a) => attributes.get(a)),
    ].join('\n');
    let style = this.#styles.get(key);
    if (style === undefined) {
      const declarations = this.#declare(name);
      style = {
        declarations,
        isHiding: hidesContent(declarations),
        isPre: /^pre/.test(declarations.get('white-space') ?? ''),
      };
      this.#styles.set(key, style);
    }
    return style;
  }

  #declare(name: string): Declarations {
    const style: Declarations = new Map();
    const attributes = this.#attributes;
    // The style sheet of a browser colours links itself, whatever colour stands around them.
    if (name === 'a') style.set('color', '#0000ee');
    const color = attributes.get('color') ?? attributes.get('text');
    if (color) style.set('color', color.toLowerCase());
    const background = attributes.get('bgcolor');
    if (background) style.set('background-color', background.toLowerCase());
    if (attributes.get('background')) style.set('background-image', 'url()');
    if (!this.#sheet.isEmpty) {
      const classes = (attributes.get('class') ?? '').split(/\s+/).filter((c) => c !== '');
      this.#sheet.match(name, classes, attributes.get('id') ?? '', style);
    }
    const own = attributes.get('style');
    return own ? readDeclarations(own, style) : style;
  }

  #close(name: string): void {
    if (name === 'style') this.#endStyle();
    if (name === 'br') {
      this.#breakLine(1, true);
      return;
    }
    if (blockElements.has(name)) this.#breakLine(paragraphElements.has(name) ? 2 : 1);
    if (this.#ignoredDepth > 0) {
      this.#ignoredDepth--;
      return;
    }
    if (!this.#openCounts.get(name)) return;
    while (this.#top.name !== name) this.#pop();
    this.#pop();
  }

  #pop(): void {
    const frame = this.#stack.pop()!;
    this.#openCounts.set(frame.name, this.#openCounts.get(frame.name)! - 1);
  }

  #extendStyle(text: string): void {
    const room = bounds.styleCharsMax - this.#styleChars;
    if (text.length > room) this.isStyleCut = true;
    this.#css += text.slice(0, Math.max(0, room));
    this.#styleChars += text.length;
  }

  #endStyle(): void {
    if (this.#css === '') return;
    if (!this.#sheet.read(this.#css)) this.isStyleCut = true;
    this.#css = '';
    this.#styles = new Map();
  }

  // Text

  #write(text: string): void {
    const frame = this.#top;
    if (frame.isHidden || isUnseen(frame.look)) {
      if (frame.name === 'style') this.#extendStyle(text);
      else if (!frame.isUnshown) this.hiddenChars += text.replace(/\s|\p{DI}/gu, '').length;
      return;
    }
    const isQuoted = frame.isQuoted || this.#isHistory;
    if (isQuoted !== this.#outIsQuoted) {
      // White space alone does not change sides.
      if (/^\s*$/.test(text)) {
        this.#hasSpace = true;
        return;
      }
      this.#endSegment();
      this.#outIsQuoted = isQuoted;
    }
    if (frame.isPre) {
      this.#emit(text);
      return;
    }
    const folded = text.replace(/[ \t\r\n\f]+/g, ' ');
    if (folded.startsWith(' ')) this.#hasSpace = true;
    const core = folded.trim() === '' ? '' : folded.replace(/^ | $/g, '');
    if (core !== '') this.#emit(core);
    if (folded.endsWith(' ')) this.#hasSpace = true;
  }

  #emit(text: string): void {
    if (this.#breaks > 0) {
      if (!this.#isEmpty) this.#out.push('\n'.repeat(this.#breaks));
    } else if (this.#hasSpace && !this.#isEmpty) this.#out.push(' ');
    this.#breaks = 0;
    this.#hasSpace = false;
    this.#isEmpty = false;
    this.#out.push(text);
  }

  #breakLine(count: number, adds = false): void {
    this.#breaks = adds ? Math.min(2, this.#breaks + count) : Math.max(this.#breaks, count);
  }

  #endSegment(): void {
    if (this.#out.length > 0) this.#segments.push({ text: this.#out.join(''), isQuoted: this.#outIsQuoted });
    this.#out = [];
    this.#isEmpty = true;
  }

  takeSegments(): readonly Segment[] {
    this.#endSegment();
    return this.#segments;
  }
}
