import { type HostileInput, padding, plain, plea, randomIntegers } from './hostile-input.ts';

const text = (
  name: string,
  body: string,
  defects: HostileInput['defects'] = [],
  keeps = plea,
): HostileInput => ({
  name,
  channel: 'mail',
  build: () => plain(body),
  defects,
  keeps,
  expectedDecision: 'by-words',
});

const letters = (next: () => number) =>
  Array.from({ length: 8 }, () => String.fromCharCode(97 + (next() % 26))).join('');

/** Plain text that floods, imitates quotations or misleads the eye. */
export const textInputs: readonly HostileInput[] = [
  {
    name: '25,000 words that nobody ever used',
    channel: 'mail',
    build: () => {
      const next = randomIntegers(11);
      return plain(`${plea} ${Array.from({ length: 25_000 }, () => letters(next)).join(' ')}`);
    },
    defects: ['text-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  text('250 KB without a space', `${plea}\r\n${'x'.repeat(250_000)}`, ['text-cut']),
  text('250 KB of spaces', `${plea}\r\n${' '.repeat(250_000)}x`, ['text-cut']),
  text('250 KB of spaces and colons', `${plea}\r\n${'From   :   '.repeat(22_000)}`, ['text-cut']),
  text('60,000 blank lines', `${plea}${'\r\n'.repeat(60_000)}x`),
  text('80,000 quoted lines', `${plea}\r\n${'>\r\n'.repeat(80_000)}`, ['text-cut']),
  text('15,000 signature separators', `${plea}\r\n${'-- \r\n'.repeat(15_000)}`, []),
  text('20,000 lines of two dashes', `${plea}\r\n${'--\r\n'.repeat(20_000)}`, []),
  text(
    '2,000 attributions',
    `${plea}\r\n${'On 3 Mar 2026, at 10:15, A <a@b.example> wrote:\r\n'.repeat(2000)}`,
    ['text-cut'],
  ),
  text(
    'attributions that never end',
    `${plea}\r\n${'On 3 Mar 2026 at 10:15 A <a@b.example>\r\n'.repeat(2000)}`,
    ['text-cut'],
  ),
  text('20,000 lines of a printed header', `${plea}\r\n\r\n${'From: a\r\n'.repeat(20_000)}`, ['text-cut']),
  text(
    'printed headers of every kind',
    `${plea}\r\n\r\n${'From: a\r\nSent: b\r\nTo: c\r\nSubject: d\r\n\r\n'.repeat(2000)}`,
    ['text-cut'],
  ),
  text('banners of forwarded mail', `${plea}\r\n${'-----Original Message-----\r\n'.repeat(5000)}`, [
    'text-cut',
  ]),
  text('lines of dashes', `${plea}\r\n${`${'-'.repeat(400)}\r\n`.repeat(600)}`, ['text-cut']),
  text('a last line that imitates a phone', `${plea}\r\nSent from ${'my '.repeat(20_000)}`, []),
  {
    name: 'nothing but a quotation',
    channel: 'mail',
    build: () => plain(`> ${plea}\r\n> Thank you.\r\n`),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ ownText }) => (ownText.includes(plea) ? null : 'nothing left'),
  },
  {
    name: 'nothing but a signature',
    channel: 'mail',
    build: () => plain(`-- \r\n${plea}\r\n`),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ ownText }) => (ownText.includes(plea) ? null : 'nothing left'),
  },
  {
    name: 'padding inside the quotation of a reply',
    channel: 'mail',
    build: () =>
      plain(
        `${plea}\r\n\r\nOn 3 Mar 2026, at 10:15, B <b@c.example> wrote:\r\n> ${padding}\r\n> ${padding}\r\n`,
      ),
    defects: [],
    isExact: true,
    keeps: plea,
    drops: 'sewer',
    expectedDecision: 'by-words',
  },
  text(
    'words split by zero width spaces',
    'The me\u200bter in Mill Lane shows a wr\u200bong read\u2060ing, please check my b\u00adill.',
    ['invisible-characters'],
  ),
  text(
    'words lengthened by invisible letters',
    plea.replace('meter', 'me\u3164ter').replace('bill', 'bi\u{e0061}ll'),
    ['invisible-characters'],
  ),
  text('a direction override', `${plea} \u202egnidoolf rewes\u202c`, ['direction-override']),
  text('direction marks as Arabic and Hebrew mail has them', `\u200f${plea}\u200e \u2067מים\u2069`, []),
  text('Cyrillic letters among Latin ones', `${plea} p\u0430yment acc\u043eunt`, ['mixed-script-word']),
  text('Greek letters among Latin ones', `${plea} w\u03b1ter`, ['mixed-script-word']),
  text(
    'letters under a pile of accents',
    plea.replaceAll('e', `e${'\u0301\u0302\u0303'.repeat(40)}`).replaceAll('e\u0301\u0302\u0303\u0301', 'e'),
    [],
    'The',
  ),
  text('250 KB of accents on one letter', `${plea} a${'\u0301'.repeat(120_000)}`, ['invisible-characters']),
  text('control characters and escapes', `${plea} \x07\x1b[31m\x9b alarm`, ['control-characters']),
  text('a NUL behind every letter', [...plea].map((letter) => `${letter}\0`).join(''), [
    'charset-undeclared',
  ]),
  text('30,000 emoji', `${plea} ${'\u{1f4a7}\ufe0f'.repeat(30_000)}`, []),
  text('80,000 characters of Chinese without a space', `${plea} ${'水表读数错误'.repeat(14_000)}`, [
    'text-cut',
  ]),
  text('80,000 letters of Thai without a space', `${plea} ${'น้ำประปา'.repeat(10_000)}`, ['text-cut']),
  text(
    'text that looks like metadata',
    `${plea}\r\nx-amz-meta-tallypost-queue: leaks\r\ntallypost-posterior: 1.0`,
    [],
  ),
  text(
    'text that looks like a program',
    `${plea} <script>alert(1)</script> \${process.exit()} '; DROP TABLE counts; --`,
    [],
  ),
  text('half a surrogate pair', `${plea} \ud83d`, []),
  {
    name: 'one text sent again and again',
    channel: 'mail',
    build: () => plain(`${plea} ${padding}`),
    defects: [],
    isExact: true,
    keeps: plea,
    expectedDecision: 'by-words',
  },
];
