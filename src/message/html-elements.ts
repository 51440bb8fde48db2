const names = (list: string): ReadonlySet<string> => new Set(list.split(' '));

export const voidElements = names('area base br col embed hr img input link meta param source track wbr');

/** Content that is never shown as text. */
export const unshownElements = names(
  'head title style script template object applet iframe noembed noframes svg math audio video canvas select datalist textarea map',
);

export const blockElements = names(
  'address article aside blockquote body center dd details dialog dir div dl dt fieldset figcaption figure footer form h1 h2 h3 h4 h5 h6 header hr html legend li main menu nav ol p pre section summary table tbody td tfoot th thead tr ul',
);

/** Elements before and after which a blank line stands. */
export const paragraphElements = names('p h1 h2 h3 h4 h5 h6 blockquote ul ol table pre');

/** Elements that stand beside each other on a line. */
export const cellElements = names('td th');

/** Ends of these end the formatting inside as well; after the end of another block it goes on. */
export const tableElements = names('table tbody tfoot thead tr td th');

/** HTML Living Standard, section 13.2.4.3: elements whose effect outlives the block in which they were left open. */
export const formattingElements = names('a b big code em font i nobr s small strike strong tt u');

/** An opening element closes these when they are the innermost open ones (HTML Living Standard, section 13.1.2.4). */
export const closedByOpening: ReadonlyMap<string, ReadonlySet<string>> = new Map([
  ['li', names('li')],
  ['dt', names('dt dd')],
  ['dd', names('dt dd')],
  ['tr', names('tr td th')],
  ['td', names('td th')],
  ['th', names('td th')],
  ['tbody', names('tr td th tbody thead')],
]);
