/** Text that is safe to stand in a page. Made only by `html` and by `trusted`. */
export class Markup {
  readonly text: string;
  constructor(text: string) {
    this.text = text;
  }
  toString(): string {
    return this.text;
  }
}

export type Content = Markup | string | number | null | false | readonly Content[];

/** A template whose values are escaped, unless they are markup themselves; null and false give nothing. Values may stand in
 *  text and in attributes with double quotes, nowhere else. */
export function html(strings: TemplateStringsArray, ...values: readonly Content[]): Markup {
  return new Markup(strings.reduce((text, string, i) => text + render(values[i - 1] ?? null) + string));
}

/** Markup from our own source text, never from a message. */
export function trusted(text: string): Markup {
  return new Markup(text);
}

function render(value: Content): string {
  if (value === null || value === false) return '';
  if (value instanceof Markup) return value.text;
  if (Array.isArray(value)) return value.map(render).join('');
  return escapeText(String(value));
}

const entities: Readonly<Record<string, string>> = {
  '&': '&amp;',
  '<': '&lt;',
  '>': '&gt;',
  '"': '&quot;',
  "'": '&#39;',
};

function escapeText(text: string): string {
  return text.replace(/[&<>"']/g, (letter) => entities[letter] as string);
}
