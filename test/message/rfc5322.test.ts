import { describe, expect, test } from 'vitest';
import { codesOf, parseWire } from './mail-source.ts';

// RFC 5322 appendix A, example by example. Dates are worked out by hand from the text of the example.

const hello = 'This is a message just to say hello.\nSo, "Hello".';
const addressesOf = (list: readonly { address: string }[]) => list.map(({ address }) => address);

describe('RFC 5322 appendix A', () => {
  test('A.1.1: a message from one person to another', async () => {
    const message = await parseWire(`
From: John Doe <jdoe@machine.example>
To: Mary Smith <mary@example.net>
Subject: Saying Hello
Date: Fri, 21 Nov 1997 09:55:06 -0600
Message-ID: <1234@local.machine.example>

This is a message just to say hello.
So, "Hello".
`);
    expect(message.from).toEqual({ address: 'jdoe@machine.example', domain: 'machine.example' });
    expect(message.recipients).toEqual([{ address: 'mary@example.net', domain: 'example.net' }]);
    expect(message.subject).toBe('Saying Hello');
    expect(message.text).toBe(hello);
    expect(message.ownText).toBe(hello);
    expect(message.messageId).toBe('1234@local.machine.example');
    // 09:55:06 at -0600 is 15:55:06 UTC.
    expect(message.sentAtMs).toBe(Date.UTC(1997, 10, 21, 15, 55, 6));
    expect(message.facts.isReply).toBe(false);
    expect(message.defects).toEqual([]);
  });

  test('A.1.1: the author counts, not the secretary who sent it', async () => {
    const message = await parseWire(`
From: John Doe <jdoe@machine.example>
Sender: Michael Jones <mjones@machine.example>
To: Mary Smith <mary@example.net>
Subject: Saying Hello
Date: Fri, 21 Nov 1997 09:55:06 -0600
Message-ID: <1234@local.machine.example>

This is a message just to say hello.
So, "Hello".
`);
    expect(message.from?.address).toBe('jdoe@machine.example');
  });

  test('A.1.2: different types of mailboxes', async () => {
    const message = await parseWire(`
From: "Joe Q. Public" <john.q.public@example.com>
To: Mary Smith <mary@x.test>, jdoe@example.org, Who? <one@y.test>
Cc: <boss@nil.test>, "Giant; \\"Big\\" Box" <sysservices@example.net>
Date: Tue, 1 Jul 2003 10:52:37 +0200
Message-ID: <5678.21-Nov-1997@example.com>

Hi everyone.
`);
    expect(message.from?.address).toBe('john.q.public@example.com');
    expect(addressesOf(message.recipients)).toEqual([
      'mary@x.test',
      'jdoe@example.org',
      'one@y.test',
      'boss@nil.test',
      'sysservices@example.net',
    ]);
    expect(message.sentAtMs).toBe(Date.UTC(2003, 6, 1, 8, 52, 37));
    expect(message.text).toBe('Hi everyone.');
  });

  test('A.1.3: group addresses, one of them empty', async () => {
    const message = await parseWire(`
From: Pete <pete@silly.example>
To: A Group:Ed Jones <c@a.test>,joe@where.test,John <jdoe@one.test>;
Cc: Undisclosed recipients:;
Date: Thu, 13 Feb 1969 23:32:54 -0330
Message-ID: <testabcd.1234@silly.example>

Testing.
`);
    expect(addressesOf(message.recipients)).toEqual(['c@a.test', 'joe@where.test', 'jdoe@one.test']);
    // 23:32:54 at -0330 is 03:02:54 UTC on the next day.
    expect(message.sentAtMs).toBe(Date.UTC(1969, 1, 14, 3, 2, 54));
    expect(message.defects).toEqual([]);
  });

  test('A.2: replies are known by In-Reply-To and References', async () => {
    const message = await parseWire(`
From: Mary Smith <mary@example.net>
To: John Doe <jdoe@machine.example>
Reply-To: "Mary Smith: Personal Account" <smith@home.example>
Subject: Re: Saying Hello
Date: Fri, 21 Nov 1997 10:01:10 -0600
Message-ID: <3456@example.net>
In-Reply-To: <1234@local.machine.example>
References: <1234@local.machine.example>

This is a reply to your hello.
`);
    expect(message.facts.isReply).toBe(true);
    expect(message.from?.address).toBe('mary@example.net');
    expect(message.subject).toBe('Re: Saying Hello');
  });

  test('A.2: the reply to the reply, with To before From', async () => {
    const message = await parseWire(`
To: "Mary Smith: Personal Account" <smith@home.example>
From: John Doe <jdoe@machine.example>
Subject: Re: Saying Hello
Date: Fri, 21 Nov 1997 11:00:00 -0600
Message-ID: <abcd.1234@local.machine.test>
In-Reply-To: <3456@example.net>
References: <1234@local.machine.example> <3456@example.net>

This is a reply to your reply.
`);
    expect(addressesOf(message.recipients)).toEqual(['smith@home.example']);
    expect(message.facts.isReply).toBe(true);
  });

  test('A.3: resent fields change nothing of the message', async () => {
    const message = await parseWire(`
Resent-From: Mary Smith <mary@example.net>
Resent-To: Jane Brown <j-brown@other.example>
Resent-Date: Mon, 24 Nov 1997 14:22:01 -0800
Resent-Message-ID: <78910@example.net>
From: John Doe <jdoe@machine.example>
To: Mary Smith <mary@example.net>
Subject: Saying Hello
Date: Fri, 21 Nov 1997 09:55:06 -0600
Message-ID: <1234@local.machine.example>

This is a message just to say hello.
So, "Hello".
`);
    expect(message.from?.address).toBe('jdoe@machine.example');
    expect(addressesOf(message.recipients)).toEqual(['mary@example.net']);
    expect(message.messageId).toBe('1234@local.machine.example');
    expect(message.sentAtMs).toBe(Date.UTC(1997, 10, 21, 15, 55, 6));
  });

  test('A.4: trace fields are walked over', async () => {
    const message = await parseWire(`
Received: from x.y.test
   by example.net
   via TCP
   with ESMTP
   id ABC12345
   for <mary@example.net>;  21 Nov 1997 10:05:43 -0600
Received: from node.example by x.y.test; 21 Nov 1997 10:01:22 -0600
From: John Doe <jdoe@node.example>
To: Mary Smith <mary@example.net>
Subject: Saying Hello
Date: Fri, 21 Nov 1997 09:55:06 -0600
Message-ID: <1234@local.node.example>

This is a message just to say hello.
So, "Hello".
`);
    expect(message.from?.address).toBe('jdoe@node.example');
    expect(message.text).toBe(hello);
    expect(message.defects).toEqual([]);
  });

  test('A.5: white space, comments and other oddities', async () => {
    const message = await parseWire(`
From: Pete(A nice \\) chap) <pete(his account)@silly.test(his host)>
To:A Group(Some people)
     :Chris Jones <c@(Chris's host.)public.example>,
         joe@example.org,
  John <jdoe@one.test> (my dear friend); (the end of the group)
Cc:(Empty list)(start)Hidden recipients  :(nobody(that I know))  ;
Date: Thu,
      13
        Feb
          1969
      23:32
               -0330 (Newfoundland Time)
Message-ID:              <testabcd.1234@silly.test>

Testing.
`);
    expect(message.from).toEqual({ address: 'pete@silly.test', domain: 'silly.test' });
    expect(addressesOf(message.recipients)).toEqual(['c@public.example', 'joe@example.org', 'jdoe@one.test']);
    expect(message.sentAtMs).toBe(Date.UTC(1969, 1, 14, 3, 2, 0));
    expect(message.messageId).toBe('testabcd.1234@silly.test');
    expect(message.text).toBe('Testing.');
  });

  test('A.6.1: obsolete addressing', async () => {
    const message = await parseWire(`
From: Joe Q. Public <john.q.public@example.com>
To: Mary Smith <@node.test:mary@example.net>, , jdoe@test  . example
Date: Tue, 1 Jul 2003 10:52:37 +0200
Message-ID: <5678.21-Nov-1997@example.com>

Hi everyone.
`);
    expect(message.from?.address).toBe('john.q.public@example.com');
    expect(addressesOf(message.recipients)).toEqual(['mary@example.net', 'jdoe@test.example']);
  });

  test('A.6.2: obsolete dates', async () => {
    const message = await parseWire(`
From: John Doe <jdoe@machine.example>
To: Mary Smith <mary@example.net>
Subject: Saying Hello
Date: 21 Nov 97 09:55:06 GMT
Message-ID: <1234@local.machine.example>

This is a message just to say hello.
So, "Hello".
`);
    expect(message.sentAtMs).toBe(Date.UTC(1997, 10, 21, 9, 55, 6));
  });

  test('A.6.3: obsolete white space and comments', async () => {
    const message = await parseWire(`
From  : John Doe <jdoe@machine(comment).  example>
To    : Mary Smith
\u0020\u0020
          <mary@example.net>
Subject     : Saying Hello
Date  : Fri, 21 Nov 1997 09(comment):   55  :  06 -0600
Message-ID  : <1234   @   local(blah)  .machine .example>

This is a message just to say hello.
So, "Hello".
`);
    expect(message.from).toEqual({ address: 'jdoe@machine.example', domain: 'machine.example' });
    expect(addressesOf(message.recipients)).toEqual(['mary@example.net']);
    expect(message.subject).toBe('Saying Hello');
    expect(message.sentAtMs).toBe(Date.UTC(1997, 10, 21, 15, 55, 6));
    expect(message.messageId).toBe('1234@local.machine.example');
    expect(message.text).toBe(hello);
    expect(codesOf(message)).toEqual([]);
  });
});
