import { bounds } from '../bounds.ts';
import { type Declarations, hidesContent, readDeclarations } from './style.ts';
import { StyleSheet } from './style-sheet.ts';

/** What an element's own attributes and the style sheets say about it. */
export interface OwnStyle {
  readonly declarations: Declarations;
  readonly isHiding: boolean;
  readonly isPreformatted: boolean;
}

export type Attributes = ReadonlyMap<string, string>;

const noStyle: OwnStyle = { declarations: new Map(), isHiding: false, isPreformatted: false };
/** Attributes that bear on style, in the order of the key; without and with a style sheet. */
const styleAttributes = ['style', 'color', 'text', 'bgcolor', 'background'] as const;
const sheetAttributes = [...styleAttributes, 'class', 'id'] as const;

/** The styles of one document; worked out once for all elements that carry the same, as most do. */
export class HtmlStyles {
  /** Set when there was more style than is kept. */
  isCut = false;
  readonly #sheet = new StyleSheet();
  #css = '';
  #cssChars = 0;
  #known = new Map<string, OwnStyle>();

  /** Text inside a `<style>` element. */
  extendSheet(text: string): void {
    const room = bounds.styleCharsMax - this.#cssChars;
    if (text.length > room) this.isCut = true;
    this.#css += text.slice(0, Math.max(0, room));
    this.#cssChars += text.length;
  }

  endSheet(): void {
    if (this.#css === '') return;
    if (!this.#sheet.read(this.#css)) this.isCut = true;
    this.#css = '';
    this.#known = new Map();
  }

  of(tag: string, attributes: Attributes): OwnStyle {
    const isLink = tag === 'a';
    const hasSheet = !this.#sheet.isEmpty;
    if (attributes.size === 0 && !hasSheet && !isLink) return noStyle;
    let key = hasSheet || isLink ? tag : '';
    for (const name of hasSheet ? sheetAttributes : styleAttributes) key += `\n${attributes.get(name) ?? ''}`;
    const known = this.#known.get(key);
    if (known !== undefined) return known;
    const declarations = this.#declare(tag, attributes);
    const style = {
      declarations,
      isHiding: hidesContent(declarations),
      isPreformatted: /^pre/.test(declarations.get('white-space') ?? ''),
    };
    this.#known.set(key, style);
    return style;
  }

  #declare(tag: string, attributes: Attributes): Declarations {
    const style: Declarations = new Map();
    // The style sheet of a browser colours links itself, whatever colour stands around them.
    if (tag === 'a') style.set('color', '#0000ee');
    const color = attributes.get('color') ?? attributes.get('text');
    if (color) style.set('color', color.toLowerCase());
    const background = attributes.get('bgcolor');
    if (background) style.set('background-color', background.toLowerCase());
    if (attributes.get('background')) style.set('background-image', 'url()');
    if (!this.#sheet.isEmpty) {
      const classes = (attributes.get('class') ?? '').split(/\s+/).filter((name) => name !== '');
      this.#sheet.match(tag, classes, attributes.get('id') ?? '', style);
    }
    const own = attributes.get('style');
    return own ? readDeclarations(own, style) : style;
  }
}
