import { bounds } from '../bounds.ts';
import { type Declarations, readDeclarations } from './style.ts';

/** Rules of a style sheet that can hide text: those with one simple selector (`p`, `.c`, `#i`, `p.c`). */
export class StyleSheet {
  readonly #rules = new Map<string, Declarations>();
  #isFull = false;

  get isEmpty(): boolean {
    return this.#rules.size === 0;
  }

  /** Adds the rules of a `<style>` element; false when there were more than are kept. Rules inside @media count for
   *  narrow screens or print, not for the text. A scanner over braces: linear, no backtracking. */
  read(css: string): boolean {
    const text = stripCssComments(css);
    let at = 0;
    while (at < text.length) {
      const open = text.indexOf('{', at);
      if (open < 0) break;
      const head = text.slice(at, open).trim();
      if (/^@(?:media|supports|layer|container)\b/.test(head)) {
        at = endOfBlock(text, open);
        continue;
      }
      const close = text.indexOf('}', open);
      const body = text.slice(open + 1, close < 0 ? text.length : close);
      if (!head.startsWith('@')) this.#add(head, body);
      if (close < 0) break;
      at = close + 1;
    }
    return !this.#isFull;
  }

  /** Declarations for an element, later rules over earlier ones within tag, class and id, in that order. */
  match(tag: string, classes: readonly string[], id: string, into: Declarations): void {
    this.#apply(tag, into);
    for (const name of classes) {
      this.#apply(`.${name}`, into);
      this.#apply(`${tag}.${name}`, into);
    }
    if (id !== '') this.#apply(`#${id}`, into);
  }

  #apply(selector: string, into: Declarations): void {
    const rule = this.#rules.get(selector);
    if (rule !== undefined) for (const [name, value] of rule) into.set(name, value);
  }

  #add(selectors: string, body: string): void {
    const declarations = readDeclarations(body);
    if (declarations.size === 0) return;
    for (const selector of selectors.split(',')) {
      const name = selector.trim();
      if (!/^(?:[a-z][a-z0-9]*)?(?:[.#][\w-]+)?$/i.test(name) || name === '') continue;
      const known = this.#rules.get(name);
      if (known !== undefined) for (const [key, value] of declarations) known.set(key, value);
      else if (this.#rules.size < bounds.styleRulesMax) this.#rules.set(name, new Map(declarations));
      else this.#isFull = true;
    }
  }
}

function stripCssComments(css: string): string {
  if (!css.includes('/*')) return css.replace(/<!--|-->/g, '');
  const kept: string[] = [];
  let at = 0;
  for (;;) {
    const open = css.indexOf('/*', at);
    if (open < 0) break;
    kept.push(css.slice(at, open));
    const close = css.indexOf('*/', open + 2);
    at = close < 0 ? css.length : close + 2;
  }
  kept.push(css.slice(at));
  return kept.join(' ').replace(/<!--|-->/g, '');
}

/** Index after the brace that closes the block opened at `open`. */
function endOfBlock(text: string, open: number): number {
  let depth = 0;
  for (let i = open; i < text.length; i++) {
    const unit = text.charCodeAt(i);
    if (unit === 0x7b) depth++;
    else if (unit === 0x7d && --depth === 0) return i + 1;
  }
  return text.length;
}
