import { describe, expect, test } from 'vitest';
import { Defects } from '../../src/message/defects.ts';
import { readHtml } from '../../src/message/html-text.ts';

const textOf = (html: string) =>
  readHtml(html, '1', new Defects())
    .segments.map(({ text }) => text)
    .join('|');

describe('HTML to text', () => {
  const cases: [what: string, html: string, text: string][] = [
    ['paragraphs', '<p>One.</p><p>Two.</p>', 'One.\n\nTwo.'],
    ['line breaks', 'One<br>two<br/>three</br>four', 'One\ntwo\nthree\nfour'],
    ['two line breaks', 'One<br><br>two', 'One\n\ntwo'],
    ['divisions', '<div>One</div><div>two</div>', 'One\ntwo'],
    ['white space of the source', '  One\n   <b> two </b>\t three ', 'One two three'],
    ['inline elements', 'wa<b>t</b>e<i>r</i>', 'water'],
    [
      'cells',
      '<table><tr><td>Reading</td><td>417</td></tr><tr><td>Date</td><td>3 March</td></tr></table>',
      'Reading 417\nDate 3 March',
    ],
    ['lists', '<ul><li>tap<li>meter</ul>', 'tap\nmeter'],
    ['preformatted text', '<pre>a  b\n  c</pre>', 'a  b\n  c'],
    ['entities', 'Fish &amp; chips &lt;3 &euro;5 &#x41;&#66; &nbsp;x', 'Fish & chips <3 €5 AB x'],
    ['an unknown entity', '&nosuch; &', '&nosuch; &'],
    ['attributes with angle brackets', '<a title="a > b">text</a>', 'text'],
    ['unquoted and empty attributes', '<a href=x class=>text</a>', 'text'],
    ['elements closed in the wrong order', '<b>one<i>two</b>three</i>', 'onetwothree'],
    ['an end tag of nothing', '</div>text</span>', 'text'],
    ['unknown elements', '<water-meter>text</water-meter>', 'text'],
    ['capitals', '<P>One</P><SCRIPT>no</SCRIPT>', 'One'],
    ['a document', '<!DOCTYPE html><html><head><title>no</title></head><body>yes</body></html>', 'yes'],
    ['text without markup', 'just text', 'just text'],
    ['nothing', '', ''],
    ['less-than in running text', '1 < 2 and 3<4', '1 < 2 and 3<4'],
    ['conditional comments', '<!--[if mso]>no<![endif]-->yes', 'yes'],
    ['a hidden paragraph that ends by itself', '<p hidden>no<p>yes', 'yes'],
    ['a hidden cell that ends by itself', '<table><tr><td style="display:none">no<td>yes</table>', 'yes'],
  ];
  test.each(cases)('%s', (_what, html, text) => {
    expect(textOf(html)).toBe(text);
  });

  test('quotations are segments of their own, white space changes no sides', () => {
    const { segments } = readHtml(
      '<p>a</p>\n<blockquote type=cite>\n<p>b</p>\n</blockquote>\n<p>c</p>',
      '1',
      new Defects(),
    );
    expect(segments).toEqual([
      { text: 'a', isQuoted: false },
      { text: 'b', isQuoted: true },
      { text: 'c', isQuoted: false },
    ]);
  });

  test('what is hidden is counted and on record; scripts and titles are not hidden text', () => {
    const defects = new Defects();
    expect(readHtml('<p>a</p><p hidden>no no</p>', '1.2', defects).hiddenChars).toBe(4);
    expect(defects.list).toEqual([{ code: 'hidden-text', place: '1.2' }]);
    const clean = new Defects();
    readHtml('<title>t</title><script>s</script><p>a</p><p hidden> \u200b&nbsp;</p>', '1', clean);
    expect(clean.list).toEqual([]);
  });
});
