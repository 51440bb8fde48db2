import { Tokenizer, type TokenizerCallbacks } from 'htmlparser2';
import { bounds } from '../bounds.ts';
import type { Defects } from './defects.ts';
import {
  blockElements,
  cellElements,
  closedByOpening,
  formattingElements,
  paragraphElements,
  tableElements,
  unshownElements,
  voidElements,
} from './html-elements.ts';
import { isQuotation, isSignature, opensHistory } from './html-quotes.ts';
import { HtmlStyles, type OwnStyle } from './html-styles.ts';
import { type Segment, SegmentWriter } from './segment-writer.ts';
import { isUnseen, type Look, lookOf, plainLook } from './style.ts';

export interface HtmlText {
  readonly segments: readonly Segment[];
  /** Letters and other marks left out because nobody could see them. */
  readonly hiddenChars: number;
}

/** What an element brings by itself. */
interface Own {
  readonly name: string;
  readonly style: OwnStyle;
  readonly isHiding: boolean;
  readonly isQuoting: boolean;
}

/** An open element with what it inherits. */
interface Frame {
  readonly own: Own;
  readonly look: Look;
  readonly isHidden: boolean;
  /** Hidden, or of a look that cannot be seen. */
  readonly isUnseen: boolean;
  /** Inside scripts, titles and the like: no attempt to hide something from the reader. */
  readonly isUnshown: boolean;
  readonly isQuoted: boolean;
  readonly isPreformatted: boolean;
}

const outermost: Frame = {
  own: {
    name: '',
    style: { declarations: new Map(), isHiding: false, isPreformatted: false },
    isHiding: false,
    isQuoting: false,
  },
  look: plainLook,
  isHidden: false,
  isUnseen: false,
  isUnshown: false,
  isQuoted: false,
  isPreformatted: false,
};

const readAttributes = new Set('style class id hidden type cite color bgcolor text background'.split(' '));
const tagCharsMax = 40;
/** Formatting that is carried over the end of a block; more is nothing that anybody writes. */
const carriedMax = 8;

/** HTML to the text that a person sees, in one linear pass over the tokens. Scripts, comments and hidden elements are
 *  left out; quotations that mail clients mark come as segments of their own. */
export function readHtml(html: string, place: string, defects: Defects): HtmlText {
  const scanner = new HtmlScanner(html);
  const tokenizer = new Tokenizer({ decodeEntities: true }, scanner);
  tokenizer.write(html);
  tokenizer.end();
  if (scanner.isTooDeep) defects.add('html-depth-cut', place);
  if (scanner.styles.isCut) defects.add('style-cut', place);
  if (scanner.hiddenChars > 0) defects.add('hidden-text', place);
  return { segments: scanner.writer.take(), hiddenChars: scanner.hiddenChars };
}

/** Follows the open elements. Not the whole of a browser's tree construction: what bears on whether text is seen. */
class HtmlScanner implements TokenizerCallbacks {
  readonly writer = new SegmentWriter();
  readonly styles = new HtmlStyles();
  hiddenChars = 0;
  isTooDeep = false;
  readonly #html: string;
  readonly #stack: Frame[] = [outermost];
  readonly #openCounts = new Map<string, number>();
  /** Elements opened beyond the depth bound; their end tags must not close others. */
  #ignoredDepth = 0;
  /** From here to the end of the page stands history. */
  #isHistory = false;
  #tag = '';
  #attributeName = '';
  #attributes = new Map<string, string>();

  constructor(html: string) {
    this.#html = html;
  }

  onopentagname(start: number, end: number): void {
    this.#tag = this.#html.slice(start, Math.min(end, start + tagCharsMax)).toLowerCase();
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
    this.#close(this.#html.slice(start, Math.min(end, start + tagCharsMax)).toLowerCase());
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

  get #top(): Frame {
    return this.#stack[this.#stack.length - 1]!;
  }

  #extendAttribute(text: string): void {
    const name = this.#attributeName;
    const value = this.#attributes.get(name) ?? '';
    const room = bounds.attributeCharsMax - value.length;
    if (text.length > room) this.styles.isCut = true;
    if (room > 0) this.#attributes.set(name, value + text.slice(0, room));
  }

  #write(text: string): void {
    const frame = this.#top;
    if (frame.isUnseen) {
      if (frame.own.name === 'style') this.styles.extendSheet(text);
      else if (!frame.isUnshown) this.hiddenChars += text.replace(/\s|\p{DI}/gu, '').length;
      return;
    }
    this.writer.write(text, frame.isQuoted || this.#isHistory, frame.isPreformatted);
  }

  #break(name: string): void {
    if (cellElements.has(name)) this.writer.space();
    else if (blockElements.has(name)) this.writer.breakLine(paragraphElements.has(name) ? 2 : 1);
  }

  #open(name: string): void {
    if (name === 'br') {
      this.writer.addBreak();
      return;
    }
    this.#break(name);
    if (blockElements.has(name) && this.#top.own.name === 'p') this.#pop();
    const closes = closedByOpening.get(name);
    if (closes !== undefined) while (closes.has(this.#top.own.name)) this.#pop();
    if (voidElements.has(name)) return;
    const classes = this.#attributes.get('class') ?? '';
    const id = this.#attributes.get('id') ?? '';
    if (opensHistory(classes, id)) this.#isHistory = true;
    const style = this.styles.of(name, this.#attributes);
    this.#push({
      name,
      style,
      isHiding: style.isHiding || this.#attributes.has('hidden'),
      isQuoting: isQuotation(name, classes, id, this.#attributes) || isSignature(classes, id),
    });
  }

  #push(own: Own): void {
    if (this.#stack.length > bounds.htmlDepthMax) {
      this.isTooDeep = true;
      this.#ignoredDepth++;
      return;
    }
    const parent = this.#top;
    const look = lookOf(parent.look, own.style.declarations);
    const isUnshown = parent.isUnshown || unshownElements.has(own.name);
    const isHidden = parent.isHidden || isUnshown || own.isHiding;
    this.#stack.push({
      own,
      look,
      isHidden,
      isUnseen: isHidden || isUnseen(look),
      isUnshown,
      isQuoted: parent.isQuoted || own.isQuoting,
      isPreformatted: parent.isPreformatted || own.name === 'pre' || own.style.isPreformatted,
    });
    this.#openCounts.set(own.name, (this.#openCounts.get(own.name) ?? 0) + 1);
  }

  #close(name: string): void {
    if (name === 'style') this.styles.endSheet();
    if (name === 'br') {
      this.writer.addBreak();
      return;
    }
    this.#break(name);
    if (this.#ignoredDepth > 0) {
      this.#ignoredDepth--;
      return;
    }
    if (!this.#openCounts.get(name)) return;
    if (blockElements.has(name)) this.#closeBlock(name);
    else this.#closeInline(name);
  }

  /** The end of a block ends all inside it; formatting left open there goes on behind it, as in a browser. */
  #closeBlock(name: string): void {
    const carried: Own[] = [];
    while (this.#top.own.name !== name) {
      const { own } = this.#top;
      if (formattingElements.has(own.name)) carried.push(own);
      this.#pop();
    }
    this.#pop();
    if (tableElements.has(name)) return;
    for (const own of carried.slice(0, carriedMax).reverse()) this.#push(own);
  }

  /** The end of an inline element leaves the blocks open that were opened inside it: what they hide stays hidden. */
  #closeInline(name: string): void {
    let at = this.#stack.length - 1;
    let isAcrossBlock = false;
    for (; this.#stack[at]!.own.name !== name; at--) {
      if (blockElements.has(this.#stack[at]!.own.name)) isAcrossBlock = true;
    }
    if (isAcrossBlock) {
      this.#stack.splice(at, 1);
      this.#openCounts.set(name, this.#openCounts.get(name)! - 1);
    } else while (this.#stack.length > at) this.#pop();
  }

  #pop(): void {
    const { own } = this.#stack.pop()!;
    this.#openCounts.set(own.name, this.#openCounts.get(own.name)! - 1);
  }
}
