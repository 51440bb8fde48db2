import { Buffer } from 'node:buffer';
import iconv from 'iconv-lite';
import { describe, expect, test } from 'vitest';
import { parseMail } from '../../src/message/mail.ts';
import { languageSamples } from './languages.ts';
import { codesOf, htmlMail, plainMail } from './mail-source.ts';

const quoted = (text: string) =>
  text
    .split('\n')
    .map((line) => `> ${line}`)
    .join('\n');

describe.each(languageSamples)('$language', (sample) => {
  const { own, earlier, words } = sample;

  test('its words are found, in the subject too', async () => {
    const subject = `=?utf-8?B?${Buffer.from(own.split('\n')[0]!).toString('base64')}?=`;
    const raw = plainMail(own).toString('utf8').replace('Subject: Question', `Subject: ${subject}`);
    const message = await parseMail(Buffer.from(raw));
    expect(message.text).toBe(own);
    expect(message.ownText).toBe(own);
    expect(message.subject).toBe(own.split('\n')[0]);
    for (const word of words) expect(message.text).toContain(word);
    expect(message.defects).toEqual([]);
  });

  test.each(sample.attributions)('reply with marked lines after: %s', async (attribution) => {
    const message = await parseMail(plainMail(`${own}\n\n${attribution}\n${quoted(earlier)}\n`));
    expect(message.ownText).toBe(own);
    expect(message.text).toContain(earlier);
  });

  test.each(sample.attributions)('reply between marked lines after: %s', async (attribution) => {
    const message = await parseMail(plainMail(`${attribution}\n\n${quoted(earlier)}\n\n${own}\n`));
    expect(message.ownText).toBe(own);
  });

  test.each(sample.attributions.filter((line) => line.includes('@')))(
    'reply over unmarked history after: %s',
    async (attribution) => {
      const message = await parseMail(plainMail(`${own}\n\n${attribution}\n\n${earlier}\n`));
      expect(message.ownText).toBe(own);
    },
  );

  test.each(sample.attributions)('reply in HTML after: %s', async (attribution) => {
    const line = attribution.replace('<', '&lt;').replace('>', '&gt;').replace('\n', ' ');
    const paragraphs = own
      .split('\n')
      .map((text) => `<div>${text}</div>`)
      .join('');
    const message = await parseMail(
      htmlMail(`${paragraphs}<br><div>${line}</div><blockquote type="cite">${earlier}</blockquote>`),
    );
    expect(message.ownText).toBe(own);
    expect(message.text).toContain(earlier);
  });

  test.each(sample.banners)('history after the banner: %s', async (banner) => {
    const message = await parseMail(
      plainMail(`${own}\n\n${banner}\n${sample.printedHeader}\n\n${earlier}\n`),
    );
    expect(message.ownText).toBe(own);
    expect(message.text).toContain(earlier);
  });

  test('history after a printed header', async () => {
    const message = await parseMail(plainMail(`${own}\n\n${sample.printedHeader}\n\n${earlier}\n`));
    expect(message.ownText).toBe(own);
  });

  test('nothing but a forwarded message: all of it counts', async () => {
    const message = await parseMail(plainMail(`${sample.banners[1]}\n${sample.printedHeader}\n\n${own}\n`));
    expect(message.ownText).toContain(own);
  });

  test('the signature is none of the own words', async () => {
    const message = await parseMail(plainMail(`${own}\n-- \nAnna Berg\nMill Lane 7\n+44 20 7946 0000\n`));
    expect(message.ownText).toBe(own);
    expect(message.text).toContain('Mill Lane 7');
  });

  test('the line that a phone adds is none of the own words', async () => {
    const message = await parseMail(plainMail(`${own}\n\n${sample.deviceLine}\n`));
    expect(message.ownText).toBe(own);
  });

  test.each(sample.charsets)('written in %s', async (charset) => {
    // Typographic marks have no place in the older charsets.
    const text = own.replace('’', "'");
    const bytes = iconv.encodingExists(charset) ? iconv.encode(text, charset) : encodeJapanese(text, charset);
    const header = Buffer.from(
      `From: a@b.example\r\nSubject: x\r\nContent-Type: text/plain; charset=${charset}\r\nContent-Transfer-Encoding: base64\r\n\r\n`,
    );
    const message = await parseMail(Buffer.concat([header, Buffer.from(bytes.toString('base64'))]));
    expect(message.text).toBe(text);
    expect(codesOf(message)).toEqual([]);
  });
});

function encodeJapanese(text: string, charset: string): Buffer {
  if (charset !== 'iso-2022-jp') throw new RangeError(`no encoder for ${charset}`);
  // RFC 1468: ESC $ B before JIS X 0208, whose two bytes are those of EUC-JP without their high bit; ESC ( B before ASCII.
  const out: number[] = [];
  let isWide = false;
  for (const character of text) {
    const bytes = iconv.encode(character, 'euc-jp');
    const wide = bytes.length === 2;
    if (wide !== isWide) out.push(0x1b, ...(wide ? [0x24, 0x42] : [0x28, 0x42]));
    isWide = wide;
    out.push(...[...bytes].map((byte) => byte & 0x7f));
  }
  if (isWide) out.push(0x1b, 0x28, 0x42);
  return Buffer.from(out);
}
