/** How mail clients mark quoted history and signatures in HTML: names as found in their mail (common practice; no
 *  standard names them). Whole class and id names only: `quote` alone is a word of ordinary pages. */
const quoteClasses = new Set([
  'gmail_quote',
  'gmail_quote_container',
  'gmail_attr',
  'moz-cite-prefix',
  'moz-forward-container',
  'yahoo_quoted',
  'protonmail_quote',
  'tutanota_quote',
  'zmail_extra',
]);

const quoteIds = new Set(['reply-intro', 'replysplit', 'mail-editor-reference-message-container']);

/** Blocks after which, to the end of the page, stands nothing but history. */
const historyNames = new Set(['divrplyfwdmsg', 'outlookmessageheader']);

/** A signature block: `gmail_signature`, `moz-signature`, `Signature`, `ms-outlook-mobile-signature` and their like. */
const signatureName = /(?:^|[\s_-])signature(?:$|[\s_-])/i;

/** True for an element that holds what somebody else wrote earlier. */
export function isQuotation(
  tag: string,
  classes: string,
  id: string,
  attributes: ReadonlyMap<string, string>,
): boolean {
  if (tag === 'blockquote' && (attributes.get('type')?.toLowerCase() === 'cite' || attributes.has('cite'))) {
    return true;
  }
  if (id !== '' && quoteIds.has(id.toLowerCase())) return true;
  if (classes === '') return false;
  return classes
    .toLowerCase()
    .split(/\s+/)
    .some((name) => quoteClasses.has(name));
}

/** True for an element with which the history begins that fills the rest of the page. */
export function opensHistory(classes: string, id: string): boolean {
  return historyNames.has(id.toLowerCase()) || historyNames.has(classes.toLowerCase());
}

/** True for an element that holds the writer's signature. */
export function isSignature(classes: string, id: string): boolean {
  return (classes !== '' && signatureName.test(classes)) || (id !== '' && signatureName.test(id));
}
