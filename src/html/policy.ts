import { createHash } from 'node:crypto';

/** A source expression of Content Security Policy Level 3 for exactly this inline text. */
export function hashSource(text: string): string {
  return `'sha256-${createHash('sha256').update(text, 'utf8').digest('base64')}'`;
}

/** Nothing is loaded from anywhere, nothing runs or is styled but what is given here word for word. */
export function strictPolicy(inline: { readonly style: string; readonly script?: string }): string {
  const { style, script } = inline;
  return [
    "default-src 'none'",
    `style-src ${hashSource(style)}`,
    ...(script === undefined ? [] : [`script-src ${hashSource(script)}`]),
    "base-uri 'none'",
    "form-action 'self'",
  ].join('; ');
}
