import { describe, expect, test } from 'vitest';
import { parseWire } from './mail-source.ts';

const flowed = (body: string, parameters = '') =>
  parseWire(
    `From: a@b.example\nSubject: x\nMIME-Version: 1.0\nContent-Type: text/plain; charset=us-ascii; format=flowed${parameters}\n\n${body}`,
  );

describe('RFC 3676', () => {
  // Section 4.1 and 4.2; the paragraphs are those of the example in section 4.1.
  test('section 4.1: lines that end in a space flow into paragraphs', async () => {
    const message = await flowed(
      "`Take some more tea,' the March Hare said to Alice, very \nearnestly.\n\n`I've had nothing yet,' Alice replied in an offended tone, `so \nI can't take more.'\n\n`You mean you can't take LESS,' said the Hatter: `it's very \neasy to take MORE than nothing.'\n",
    );
    expect(message.text).toBe(
      "`Take some more tea,' the March Hare said to Alice, very earnestly.\n\n`I've had nothing yet,' Alice replied in an offended tone, `so I can't take more.'\n\n`You mean you can't take LESS,' said the Hatter: `it's very easy to take MORE than nothing.'",
    );
  });

  test('section 4.3: the signature separator is not flowed and opens the signature', async () => {
    const message = await flowed(
      'Please call me back. \nThe meter is \nbroken.\n-- \nAnna Berg\nTel. 555 0100\n',
    );
    expect(message.text).toBe('Please call me back. The meter is broken.\n-- \nAnna Berg\nTel. 555 0100');
    expect(message.ownText).toBe('Please call me back. The meter is broken.');
  });

  test('section 4.4: a space that stuffs a line is dropped', async () => {
    const message = await flowed('From the start:\n >no quotation\n  indented\n');
    expect(message.text).toBe('From the start:\n>no quotation\n indented');
  });

  test('section 4.5: quoted lines of one depth flow, quotations are not own words', async () => {
    // After the example of section 4.5: two levels of quotation and an answer.
    const message = await flowed(
      ">> `Take some more tea,' the March Hare said to Alice, very \n>> earnestly.\n>\n> `I've had nothing yet,' Alice replied in an offended tone, `so \n> I can't take more.'\n\n`You mean you can't take LESS,' said the Hatter: `it's very \neasy to take MORE than nothing.'\n",
    );
    expect(message.text).toContain(">> `Take some more tea,' the March Hare said to Alice, very earnestly.");
    expect(message.ownText).toBe(
      "`You mean you can't take LESS,' said the Hatter: `it's very easy to take MORE than nothing.'",
    );
  });

  test('section 4.2: with DelSp=yes the space of a soft break goes too', async () => {
    const message = await flowed('water \nmeter\n', '; delsp=yes');
    expect(message.text).toBe('watermeter');
    expect((await flowed('water \nmeter\n')).text).toBe('water meter');
  });

  test('section 3.1: format means nothing outside text/plain', async () => {
    const message = await parseWire(
      'From: a@b.example\nSubject: x\nContent-Type: text/html; format=flowed; delsp=yes\n\n<p>water \nmeter</p>\n',
    );
    expect(message.text).toBe('water meter');
  });
});
