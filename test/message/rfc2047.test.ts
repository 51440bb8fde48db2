import { describe, expect, test } from 'vitest';
import { parseWire } from './mail-source.ts';

// RFC 2047 section 8. Words stand in a subject here, so that what is displayed can be compared whole.

const subjectOf = async (value: string) =>
  (await parseWire(`From: a@b.example\nSubject: ${value}\n\ntext\n`)).subject;

describe('RFC 2047 section 8', () => {
  const displayed: [encoded: string, shown: string][] = [
    ['=?US-ASCII?Q?Keith_Moore?= <moore@cs.utk.edu>', 'Keith Moore <moore@cs.utk.edu>'],
    ['=?ISO-8859-1?Q?Keld_J=F8rn_Simonsen?= <keld@dkuug.dk>', 'Keld Jørn Simonsen <keld@dkuug.dk>'],
    ['=?ISO-8859-1?Q?Andr=E9?= Pirard <PIRARD@vm1.ulg.ac.be>', 'André Pirard <PIRARD@vm1.ulg.ac.be>'],
    [
      '=?ISO-8859-1?B?SWYgeW91IGNhbiByZWFkIHRoaXMgeW8=?=\n    =?ISO-8859-2?B?dSB1bmRlcnN0YW5kIHRoZSBleGFtcGxlLg==?=',
      'If you can read this you understand the example.',
    ],
    ['=?ISO-8859-1?Q?Olle_J=E4rnefors?= <ojarnef@admin.kth.se>', 'Olle Järnefors <ojarnef@admin.kth.se>'],
    ['=?ISO-8859-1?Q?Patrik_F=E4ltstr=F6m?= <paf@nada.kth.se>', 'Patrik Fältström <paf@nada.kth.se>'],
    [
      'Nathaniel Borenstein <nsb@thumper.bellcore.com>\n (=?iso-8859-8?b?7eXs+SDv4SDp7Oj08A==?=)',
      'Nathaniel Borenstein <nsb@thumper.bellcore.com> (םולש ןב ילטפנ)',
    ],
    ['(=?ISO-8859-1?Q?a?=)', '(a)'],
    ['(=?ISO-8859-1?Q?a?= b)', '(a b)'],
    ['(=?ISO-8859-1?Q?a?= =?ISO-8859-1?Q?b?=)', '(ab)'],
    ['(=?ISO-8859-1?Q?a?=  =?ISO-8859-1?Q?b?=)', '(ab)'],
    ['(=?ISO-8859-1?Q?a?=\n    =?ISO-8859-1?Q?b?=)', '(ab)'],
    ['(=?ISO-8859-1?Q?a_b?=)', '(a b)'],
    ['(=?ISO-8859-1?Q?a?= =?ISO-8859-2?Q?_b?=)', '(a b)'],
  ];
  test.each(displayed)('%j is displayed as %j', async (encoded, shown) => {
    expect(await subjectOf(encoded)).toBe(shown);
  });

  test('encoded words in display names leave the addresses alone', async () => {
    const message = await parseWire(`
From: =?US-ASCII?Q?Keith_Moore?= <moore@cs.utk.edu>
To: =?ISO-8859-1?Q?Keld_J=F8rn_Simonsen?= <keld@dkuug.dk>
CC: =?ISO-8859-1?Q?Andr=E9?= Pirard <PIRARD@vm1.ulg.ac.be>
Subject: =?ISO-8859-1?B?SWYgeW91IGNhbiByZWFkIHRoaXMgeW8=?=
 =?ISO-8859-2?B?dSB1bmRlcnN0YW5kIHRoZSBleGFtcGxlLg==?=

text
`);
    expect(message.from?.address).toBe('moore@cs.utk.edu');
    expect(message.recipients.map(({ address }) => address)).toEqual([
      'keld@dkuug.dk',
      'pirard@vm1.ulg.ac.be',
    ]);
    expect(message.subject).toBe('If you can read this you understand the example.');
  });

  test('an encoded word cannot smuggle another address (section 5, rule 3)', async () => {
    // The word decodes to "<boss@bank.example>".
    const message = await parseWire(
      'From: =?utf-8?Q?=3Cboss=40bank=2Eexample=3E?= <real@sender.example>\nSubject: x\n\ntext\n',
    );
    expect(message.from?.address).toBe('real@sender.example');
  });
});
