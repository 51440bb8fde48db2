import { createHash } from 'node:crypto';
import { describe, expect, it } from 'vitest';
import { html, trusted } from '../../src/html/html.ts';
import { strictPolicy } from '../../src/html/policy.ts';
import { plainLine, visiblePieces } from '../../src/html/visible-text.ts';

describe('the html template', () => {
  it('escapes values in text and attributes and leaves markup alone', () => {
    const mail = `<script>alert("x")</script> & 'y'`;
    expect(html`<p title="${mail}">${mail}${html`<b>${1}</b>`}${null}${false}</p>`.text).toBe(
      '<p title="&lt;script&gt;alert(&quot;x&quot;)&lt;/script&gt; &amp; &#39;y&#39;">' +
        '&lt;script&gt;alert(&quot;x&quot;)&lt;/script&gt; &amp; &#39;y&#39;<b>1</b></p>',
    );
  });

  it('joins lists and keeps zero and the empty string apart from nothing', () => {
    expect(html`<ul>${[html`<li>a</li>`, html`<li>${'<'}</li>`]}</ul>${0}${''}`.text).toBe(
      '<ul><li>a</li><li>&lt;</li></ul>0',
    );
    expect(html`${trusted('<hr>')}`.text).toBe('<hr>');
  });
});

describe('text made visible', () => {
  it('names overrides and controls instead of obeying them', () => {
    expect(visiblePieces('pay \u202e001\u202c\u0007now')).toEqual([
      { text: 'pay ', isName: false },
      { text: 'right-to-left override', isName: true },
      { text: '001', isName: false },
      { text: 'end of direction', isName: true },
      { text: 'U+0007', isName: true },
      { text: 'now', isName: false },
    ]);
  });

  it('keeps line feeds, Hebrew and joiners as they are', () => {
    const text = 'שלום\n\tक्‍ष';
    expect(visiblePieces(text)).toEqual([{ text, isName: false }]);
  });

  it('makes one line of a subject, cut between letters', () => {
    expect(plainLine('  Re:\u202e a\r\n b ', 20)).toBe('Re: a b');
    expect(plainLine('abc😀def', 5)).toBe('abc…'); // the cut would halve the surrogate pair
  });
});

describe('the content policy', () => {
  it('names the hash of the very style and script', () => {
    const hash = (text: string) => createHash('sha256').update(text).digest('base64');
    expect(strictPolicy({ style: 'p{}', script: 'go()' })).toBe(
      `default-src 'none'; style-src 'sha256-${hash('p{}')}'; script-src 'sha256-${hash('go()')}'; base-uri 'none'; form-action 'self'`,
    );
  });
});
