import { type HostileInput, html, htmlPart, multipart, padding, plea, textPart } from './hostile-input.ts';

const hides = (name: string, markup: string): HostileInput => ({
  name,
  channel: 'mail',
  build: () => html(markup),
  defects: ['hidden-text'],
  keeps: plea,
  drops: 'sewer',
  expectedDecision: 'by-words',
});

/** `isExact` HTML: nothing wrong with it. */
const shows = (name: string, markup: string): HostileInput => ({
  name,
  channel: 'mail',
  build: () => html(markup),
  defects: [],
  isExact: true,
  keeps: plea,
  expectedDecision: 'by-words',
});

const slow = (name: string, markup: string, defects: HostileInput['defects'] = []): HostileInput => ({
  name,
  channel: 'mail',
  build: () => html(markup),
  defects,
  keeps: plea,
  expectedDecision: 'by-words',
});

const p = `<p>${plea}</p>`;

/** HTML that hides, floods or confuses. */
export const markupInputs: readonly HostileInput[] = [
  hides('hidden by display:none', `${p}<div style="display: none">${padding}</div>`),
  hides('hidden by visibility', `${p}<div style="visibility:hidden">${padding}</div>`),
  hides('hidden by opacity', `${p}<div style="opacity:0.01">${padding}</div>`),
  hides('hidden by a font size of nothing', `${p}<span style="font-size:0px">${padding}</span>`),
  hides('hidden by a font of one point', `${p}<span style="font:1px/1px serif">${padding}</span>`),
  hides('white on white', `${p}<span style="color:#ffffff">${padding}</span>`),
  hides('nearly white on white', `${p}<font color="#FEFDFC">${padding}</font>`),
  hides('white on white by hsl', `${p}<span style="color:hsl(0, 0%, 100%)">${padding}</span>`),
  hides(
    'blue on blue in a table cell',
    `${p}<table><tr><td bgcolor="#0000aa"><font color="#0202aa">${padding}</font></td></tr></table>`,
  ),
  hides('transparent letters', `${p}<span style="color:rgba(0,0,0,0)">${padding}</span>`),
  hides('the hidden attribute', `${p}<div hidden>${padding}</div>`),
  hides('no height and clipped', `${p}<div style="max-height:0;overflow:hidden">${padding}</div>`),
  hides('pushed off the page', `${p}<div style="position:absolute;left:-9999px">${padding}</div>`),
  hides('indented off the page', `${p}<div style="text-indent:-9999px">${padding}</div>`),
  hides('clipped away', `${p}<div style="position:absolute;clip:rect(0,0,0,0)">${padding}</div>`),
  hides('scaled to nothing', `${p}<div style="transform:scale(0)">${padding}</div>`),
  hides(
    'hidden by a class of the style sheet',
    `<style>.x9{display:none}</style>${p}<div class="a x9">${padding}</div>`,
  ),
  hides(
    'hidden by an id of the style sheet',
    `<style>/* } */ #k { color : white ; }</style>${p}<div id="k">${padding}</div>`,
  ),
  hides('hidden with entities in the style', `${p}<div style="display&#58;none">${padding}</div>`),
  hides('hidden in capitals with !important', `${p}<DIV STYLE="DISPLAY:NONE !IMPORTANT">${padding}</DIV>`),
  hides(
    'hidden inside hidden inside shown',
    `${p}<div style="display:none"><p style="display:block">${padding}</p></div>`,
  ),
  hides(
    'hidden by a block whose inline parent ends first',
    `<b>${p}<div style="display:none"></b>${padding}</div>`,
  ),
  hides(
    'white by formatting left open in an earlier paragraph',
    `${p}<p><font color="white">.</p><div>${padding}</div>`,
  ),
  shows('formatting left open in an earlier table cell', `<table><td><font color="white"></td></table>${p}`),
  shows('hidden only for narrow screens', `<style>@media (max-width:600px){p{display:none}}</style>${p}`),
  shows('white on a dark button', `<a style="background:#003366;color:#ffffff">${plea}</a>`),
  shows(
    'a container without font size whose content has one',
    `<td style="font-size:0"><div style="font-size:14px">${plea}</div></td>`,
  ),
  shows(
    'white on an unknown picture',
    `<div style="background-image:url(x.png)"><span style="color:white">${plea}</span></div>`,
  ),
  {
    name: 'comments, scripts, titles and templates',
    channel: 'mail',
    build: () =>
      html(
        `<head><title>${padding}</title><script>${padding}</script><style>${padding}</style></head><!-- ${padding} --><template>${padding}</template><noframes>${padding}</noframes>${p}`,
      ),
    defects: [],
    isExact: true,
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
  },
  {
    name: 'everything hidden',
    channel: 'mail',
    build: () => html(`<div style="display:none">${padding}</div>`),
    defects: ['hidden-text', 'text-missing'],
    drops: 'sewer',
    expectedDecision: 'by-words',
  },
  {
    name: '400 KB of white padding around one line',
    channel: 'mail',
    build: () =>
      html(
        `<div style="color:#fff">${`${padding} `.repeat(5000)}</div>${p}<div style="color:#fff">${`${padding} `.repeat(5000)}</div>`,
      ),
    defects: ['hidden-text'],
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
  },
  {
    name: 'a plain alternative that says something else than the HTML',
    channel: 'mail',
    build: () => multipart('alternative', [textPart(`${padding} `.repeat(20)), htmlPart(p)]),
    defects: ['alternatives-differ'],
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
  },
  {
    name: 'a plain alternative that only points to the HTML',
    channel: 'mail',
    build: () =>
      multipart('alternative', [
        textPart('This message needs an HTML reader.'),
        htmlPart(`${p}${'<p>The water stays off.</p>'.repeat(20)}`),
      ]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'an HTML alternative that shows nothing',
    channel: 'mail',
    build: () => multipart('alternative', [textPart(plea), htmlPart('<img src="cid:x">')]),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
  slow('160,000 elements inside each other', `${p}${'<b>'.repeat(160_000)}`, ['html-depth-cut']),
  slow('120,000 end tags of nothing', `${p}${'</b>'.repeat(120_000)}`),
  slow(
    '500 open elements and 100,000 end tags of another',
    `${p}${'<b>'.repeat(500)}${'</i>'.repeat(100_000)}`,
  ),
  slow('120,000 paragraphs that never end', `${p}${'<p>x'.repeat(120_000)}`, ['text-cut']),
  slow('100,000 table cells that never end', `${p}<table>${'<td>x'.repeat(100_000)}`, ['text-cut']),
  slow('500 KB of less-than signs', `${p}${'<'.repeat(500_000)}`, ['text-cut']),
  slow('500 KB of ampersands', `${p}${'&'.repeat(500_000)}`, ['text-cut']),
  slow('80,000 entities', `${p}${'&#x61;'.repeat(80_000)}`, ['text-cut']),
  slow('entities beyond Unicode', `${p}${'&#x110000;&#xD800;&#0;&#99999999999;'.repeat(10)}`),
  slow('an attribute of 500 KB', `${p}<a href="${'x'.repeat(500_000)}">x</a>`),
  slow('a style of 500 KB', `${p}<a style="${'color:red;'.repeat(50_000)}">x</a>`, ['style-cut']),
  slow('60,000 attributes', `${p}<a ${'style=x '.repeat(60_000)}>x</a>`),
  slow(
    '12,000 links, each with a style of its own',
    `${p}${Array.from({ length: 12_000 }, (_, i) => `<a style="color:#${i.toString(16)}">x</a>`).join('')}`,
  ),
  slow(
    'a style sheet of 500 KB of braces',
    `<style>${'{'.repeat(250_000)}${'}'.repeat(250_000)}</style>${p}`,
  ),
  slow(
    'a style sheet of 600 rules',
    `<style>${Array.from({ length: 600 }, (_, i) => `.c${i}{color:red}`).join('')}</style>${p}`,
    ['style-cut'],
  ),
  slow('a style sheet of 60,000 media queries', `<style>${'@media{'.repeat(60_000)}</style>${p}`),
  slow(
    'a style sheet of 20,000 rules',
    `<style>${Array.from({ length: 20_000 }, (_, i) => `.c${i}{color:red}`).join('')}</style>${p}`,
  ),
  slow('a style sheet of open comments', `<style>${'/*'.repeat(100_000)}</style>${p}`),
  slow('10,000 style sheets', `${'<style>p{color:#111}</style>'.repeat(10_000)}${p}`),
  {
    name: 'a comment that never ends',
    channel: 'mail',
    build: () => html(`${p}<!-- ${padding.repeat(5000)}`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  slow('a script that never ends', `${p}<script>${padding.repeat(5000)}`),
  slow('a tag that never ends', `${p}<div title="${padding.repeat(5000)}`),
  slow('text after <plaintext>', `${p}<plaintext><b>raw`),
  slow('foreign elements', `${p}<svg><text>picture</text><![CDATA[x]]></svg><math><mi>x</mi></math>`),
  slow('10,000 quotations inside each other', `${p}${'<blockquote type="cite">'.repeat(10_000)}old`, [
    'html-depth-cut',
  ]),
  slow('NUL characters inside tags', `<p\0>${plea}</p\0><di\0v>x</div>`),
];
