import { describe, expect, test } from 'vitest';
import { parseWire } from './mail-source.ts';

// RFC 2049 appendix A, "A complex multipart example"; the base64 of the two placeholders is ours.

const complex = `
MIME-Version: 1.0
From: Nathaniel Borenstein <nsb@nsb.fv.com>
To: Ned Freed <ned@innosoft.com>
Date: Fri, 07 Oct 1994 16:15:05 -0700 (PDT)
Subject: A multipart example
Content-Type: multipart/mixed;
              boundary=unique-boundary-1

This is the preamble area of a multipart message.
Mail readers that understand multipart format
should ignore this preamble.

If you are reading this text, you might want to
consider changing to a mail reader that understands
how to properly display multipart messages.

--unique-boundary-1

  ... Some text appears here ...

[Note that the blank between the boundary and the start
 of the text in this part means no header fields were
 given and this is text in the US-ASCII character set.
 It could have been done with explicit typing as in the
 next part.]

--unique-boundary-1
Content-type: text/plain; charset=US-ASCII

This could have been part of the previous part, but
illustrates explicit versus implicit typing of body
parts.

--unique-boundary-1
Content-Type: multipart/parallel; boundary=unique-boundary-2

--unique-boundary-2
Content-Type: audio/basic
Content-Transfer-Encoding: base64

AAEC

--unique-boundary-2
Content-Type: image/jpeg
Content-Transfer-Encoding: base64

/9j/

--unique-boundary-2--

--unique-boundary-1
Content-type: text/enriched

This is <bold><italic>enriched.</italic></bold>
<smaller>as defined in RFC 1896</smaller>

Isn't it
<bigger><bigger>cool?</bigger></bigger>

--unique-boundary-1
Content-Type: message/rfc822

From: (mailbox in US-ASCII)
To: (address in US-ASCII)
Subject: (subject in US-ASCII)
Content-Type: Text/plain; charset=ISO-8859-1
Content-Transfer-Encoding: Quoted-printable

  ... Additional text in ISO-8859-1 goes here ...

--unique-boundary-1--
`;

describe('RFC 2049 appendix A', () => {
  test('its parts are five: text, text, audio and picture, enriched text, an embedded message', async () => {
    const message = await parseWire(complex);
    expect(message.subject).toBe('A multipart example');
    expect(message.sentAtMs).toBe(Date.UTC(1994, 9, 7, 23, 15, 5));
    expect(message.attachments.map(({ kind }) => kind)).toEqual(['audio', 'image', 'message']);
    expect(message.text).toContain('... Some text appears here ...');
    expect(message.text).toContain('illustrates explicit versus implicit typing of body\nparts.');
    expect(message.text).toContain("This is enriched. as defined in RFC 1896 Isn't it cool?");
    expect(message.text).toContain('... Additional text in ISO-8859-1 goes here ...');
    expect(message.text).not.toContain('preamble area');
    expect(message.defects).toEqual([]);
  });

  test('the embedded message counts as text of the message, not as own words', async () => {
    const message = await parseWire(complex);
    expect(message.text).toContain('(subject in US-ASCII)');
    expect(message.ownText).toContain('Some text appears here');
    expect(message.ownText).not.toContain('Additional text');
    expect(message.ownText).not.toContain('(subject in US-ASCII)');
  });

  test('RFC 2046 section 5.1.1: the simple multipart of two text parts, preamble and epilogue left out', async () => {
    const message = await parseWire(`
From: Nathaniel Borenstein <nsb@bellcore.com>
To: Ned Freed <ned@innosoft.com>
Date: Sun, 21 Mar 1993 23:56:48 -0800 (PST)
Subject: Sample message
MIME-Version: 1.0
Content-type: multipart/mixed; boundary="simple boundary"

This is the preamble.  It is to be ignored, though it
is a handy place for composition agents to include an
explanatory note to non-MIME conformant readers.

--simple boundary

This is implicitly typed plain US-ASCII text.
It does NOT end with a linebreak.
--simple boundary
Content-type: text/plain; charset=us-ascii

This is explicitly typed plain US-ASCII text.
It DOES end with a linebreak.

--simple boundary--

This is the epilogue.  It is also to be ignored.
`);
    expect(message.text).toBe(
      'This is implicitly typed plain US-ASCII text.\nIt does NOT end with a linebreak.\n\nThis is explicitly typed plain US-ASCII text.\nIt DOES end with a linebreak.',
    );
  });

  test('RFC 2046 section 5.1.4: of the three alternatives the plain text is taken', async () => {
    const message = await parseWire(`
From: Nathaniel Borenstein <nsb@bellcore.com>
To: Ned Freed <ned@innosoft.com>
Date: Mon, 22 Mar 1993 09:41:09 -0800 (PST)
Subject: Formatted text mail
MIME-Version: 1.0
Content-Type: multipart/alternative; boundary=boundary42

--boundary42
Content-Type: text/plain; charset=us-ascii

... plain text version of message goes here ...

--boundary42
Content-Type: text/html

... HTML version of same message goes here ...

--boundary42
Content-Type: application/x-whatever

... fanciest version of same message goes here ...

--boundary42--
`);
    expect(message.text).toBe('... plain text version of message goes here ...');
  });
});
