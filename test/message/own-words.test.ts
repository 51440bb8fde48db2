import { describe, expect, test } from 'vitest';
import { parseMail } from '../../src/message/mail.ts';
import { htmlMail, plainMail } from './mail-source.ts';

const ownOf = async (body: string) => (await parseMail(plainMail(body))).ownText;
const ownOfHtml = async (html: string) => (await parseMail(htmlMail(html))).ownText;

describe('own words in plain text', () => {
  // [what it is, the body, what the writer wrote]
  const separated: [string, string, string][] = [
    ['quoted lines below', 'Yes, please.\n\n> Shall we come on Monday?\n', 'Yes, please.'],
    ['quoted lines above', '> Shall we come on Monday?\n\nYes, please.\n', 'Yes, please.'],
    ['answers between', '> Monday?\nNo.\n> Tuesday?\nYes.\n', 'No.\nYes.'],
    ['quoted lines with spaces before the mark', 'Yes.\n > Monday?\n   > or later?\n', 'Yes.'],
    [
      'an attribution over three lines',
      'Yes.\n\nOn Tue, 3 Mar 2026\nat 10:15, Fenmark Water\n<help@fenmarkwater.example> wrote:\n> Monday?\n',
      'Yes.',
    ],
    ['a signature', 'The water is brown.\n-- \nAnna Berg\nMill Lane 7', 'The water is brown.'],
    ['a signature without the space', 'The water is brown.\n--\nAnna Berg', 'The water is brown.'],
    ['a signature between answer and history', 'Yes.\n-- \nAnna\n\n> Monday?\n', 'Yes.'],
    [
      'a signature, then a banner',
      'Yes.\n-- \nAnna\n\n-----Original Message-----\nFrom: B\nSent: x\nTo: A\n\nMonday?',
      'Yes.',
    ],
    [
      'a divider line over a printed header',
      'Yes.\n\n________________________________\nFrom: B <b@c.example>\nSent: 3 March 2026 10:15\nTo: A\nSubject: Visit\n\nMonday?',
      'Yes.',
    ],
    [
      'a printed header with bold marks',
      'Yes.\n\n*From:* B <b@c.example>\n*Date:* 3 March 2026\n*To:* A\n*Subject:* Visit\n\nMonday?',
      'Yes.',
    ],
    [
      'a banner over marked lines and an answer below',
      '-----Original Message-----\n> Monday?\n\nYes.',
      'Yes.',
    ],
    [
      'two levels of history',
      'Yes.\n\nOn 3 Mar 2026 10:15, B <b@c.example> wrote:\n> On 2 Mar 2026 A wrote:\n>> When?\n> Monday?',
      'Yes.',
    ],
  ];
  test.each(separated)('%s', async (_what, body, own) => {
    expect(await ownOf(body)).toBe(own);
  });

  const kept: [string, string][] = [
    ['a line with a colon', 'My neighbour wrote: pay nothing.\nIs that right?'],
    [
      'prose that dates what somebody wrote',
      'On 3 March 2026 your engineer, Mr Brown, wrote in his report the following:\nthe pipe is sound.',
    ],
    ['a line that ends with a colon', 'The notice wrote:\nthe water is off from 8 to 12.\nIs that right?'],
    ['a period of time', 'We are away.\nFrom: 3 March\nTo: 9 March\nPlease stop the supply.'],
    ['a list of two dashes', 'Broken:\n-- the tap\n-- the meter'],
    ['a dash as a pause', 'I paid -- twice -- in March.'],
    ['a divider in the middle of a long letter', `First.\n--\n${'A line of the letter.\n'.repeat(20)}End.`],
    ['an arrow', 'The arrow points -> left > right.'],
    ['greetings at the end', 'The water is brown.\n\nKind regards\nAnna Berg'],
    ['a field name in a sentence', 'Subject: my bill\nI paid it.'],
    [
      'a time and an address in a sentence',
      'I wrote to b@c.example on 3 March 2026 at 10:15 and nobody answered:\nplease do.',
    ],
    ['the word original message', 'Your original message never arrived.\nPlease send it again.'],
    [
      "a last line that is no phone's",
      'Sent from the post office last Monday, the letter with reading 00417 and the form has not arrived yet.',
    ],
  ];
  test.each(kept)('nothing is taken away from %s', async (_what, body) => {
    expect(await ownOf(body)).toBe(body.trimEnd());
  });

  // When nothing with a letter or digit would be left, the whole text counts.
  const wholes: [string, string][] = [
    ['only a quotation', '> The water is brown.'],
    ['only a signature', '-- \nThe water is brown.'],
    ['only history', 'On 3 Mar 2026 10:15, B <b@c.example> wrote:\n\nThe water is brown.'],
    [
      'only a forwarded copy',
      '---------- Forwarded message ---------\nFrom: B\nDate: x\nSubject: y\n\nThe water is brown.',
    ],
    ['punctuation over a quotation', '!!!\n\n> The water is brown.'],
    ["only a phone's line", 'Sent from my phone'],
  ];
  test.each(wholes)('%s: the whole text', async (_what, body) => {
    expect(await ownOf(body)).toBe(body);
  });
});

describe('own words in HTML', () => {
  const separated: [string, string, string][] = [
    ['blockquote type=cite', '<p>Yes.</p><blockquote type="cite"><p>Monday?</p></blockquote>', 'Yes.'],
    [
      'blockquote with cite',
      '<p>Yes.</p><blockquote cite="mid:1@a.example">Monday?</blockquote><p>Thanks.</p>',
      'Yes.\n\nThanks.',
    ],
    [
      'a quotation container with its attribution',
      '<div>Yes.</div><div class="gmail_quote"><div class="gmail_attr">On Tue B wrote:<br></div><blockquote>Monday?</blockquote></div>',
      'Yes.',
    ],
    [
      'the line before a citation',
      '<p>Yes.</p><div class="moz-cite-prefix">Am 3.3.26 schrieb B:</div><blockquote type="cite">Monday?</blockquote>',
      'Yes.',
    ],
    [
      'the history block of a reply',
      '<div>Yes.</div><hr><div id="divRplyFwdMsg"><b>From:</b> B<br><b>Sent:</b> x<br><b>To:</b> A<br><b>Subject:</b> y</div><div>Monday?</div>',
      'Yes.',
    ],
    [
      'a printed header in bold',
      '<p>Yes.</p><div><p><b>From:</b> B<br><b>Sent:</b> 3 March<br><b>To:</b> A<br><b>Subject:</b> y</p></div><p>Monday?</p>',
      'Yes.',
    ],
    ['a signature by class', '<p>Yes.</p><div class="gmail_signature">Anna Berg, Mill Lane 7</div>', 'Yes.'],
    ['a signature by id', '<p>Yes.</p><div id="Signature">Anna Berg</div>', 'Yes.'],
    ['a signature after the separator', '<p>Yes.</p><div>-- <br>Anna Berg</div>', 'Yes.'],
  ];
  test.each(separated)('%s', async (_what, html, own) => {
    expect(await ownOfHtml(html)).toBe(own);
  });

  const kept: [string, string, string][] = [
    [
      'an indented paragraph',
      '<p>They wrote to me:</p><blockquote>Pay now.</blockquote><p>Why?</p>',
      'They wrote to me:\n\nPay now.\n\nWhy?',
    ],
    [
      'a class that only contains the word',
      '<div class="quote-request">A price for a new pipe, please.</div>',
      'A price for a new pipe, please.',
    ],
    ['only a quotation', '<blockquote type="cite">The water is brown.</blockquote>', 'The water is brown.'],
  ];
  test.each(kept)('kept: %s', async (_what, html, own) => {
    expect(await ownOfHtml(html)).toBe(own);
  });
});
