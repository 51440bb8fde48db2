import { Buffer } from 'node:buffer';
import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { simpleParser } from 'mailparser';
import { afterAll, describe, expect, test } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { Defects, defectKinds } from '../../src/message/defects.ts';
import { parseForm } from '../../src/message/form.ts';
import { readHtml } from '../../src/message/html-text.ts';
import { parseMail } from '../../src/message/mail.ts';
import type { Message } from '../../src/message/message.ts';
import { inPieces } from '../message/mail-source.ts';
import { readForeignMail } from './foreign-mail.ts';
import { tree, writeMail } from './mime-tree.ts';
import { mutate, mutation } from './mutations.ts';

/** All cases together; a long run sets another number. */
const cases = Number(process.env.TALLYPOST_FUZZ_CASES ?? 2000);
const seed = Number(process.env.TALLYPOST_FUZZ_SEED ?? 20260303);
const runs = (share: number) => ({
  numRuns: Math.max(20, Math.round(cases * share)),
  seed,
  interruptAfterTimeLimit: 3_600_000,
});
const timeoutMs = 3_600_000;

const tally = { cases: 0, throws: 0, textsPut: 0, textsFound: 0 };
afterAll(() => {
  console.log(
    `fuzz, seed ${seed}: ${tally.cases} cases, ${tally.throws} throws, ${tally.textsFound} of ${tally.textsPut} texts found`,
  );
});

async function parsed(raw: Uint8Array | AsyncIterable<Uint8Array>): Promise<Message> {
  tally.cases++;
  try {
    return await parseMail(raw);
  } catch (error) {
    tally.throws++;
    throw error;
  }
}

const damage = fc.array(mutation, { maxLength: 3 });
const lineEnd = fc.constantFrom('\r\n' as const, '\n' as const);

/** Which texts are not found whole, every word of them. */
function lostTexts(message: Message, texts: readonly { words: readonly string[] }[]): string[] {
  return texts.flatMap(({ words }) => {
    tally.textsPut++;
    const lost = words.filter((word) => !message.text.includes(word));
    if (lost.length === 0) tally.textsFound++;
    return lost;
  });
}

function expectSound(message: Message): void {
  expect(message.text.length).toBeLessThanOrEqual(bounds.textCharsMax + 200);
  expect(message.subject.length).toBeLessThanOrEqual(bounds.subjectCharsMax);
  expect(message.recipients.length).toBeLessThanOrEqual(bounds.recipientsMax);
  expect(message.defects.length).toBeLessThanOrEqual(bounds.defectsMax);
  expect(message.text === '').toBe(message.ownText === '');
  expect(/[^\P{Cc}\t\n]|\p{Surrogate}/u.test(message.text + message.subject + message.messageId)).toBe(false);
  for (const { code } of message.defects) expect(Object.hasOwn(defectKinds, code)).toBe(true);
}

describe(`generated mail (seed ${seed})`, () => {
  test(
    'every text that was put in is found, nothing else is, and every file is listed',
    () =>
      fc.assert(
        fc.asyncProperty(tree, lineEnd, async (root, eol) => {
          const written = writeMail(root, eol);
          const message = await parsed(written.raw);
          expectSound(message);
          expect(lostTexts(message, written.texts)).toEqual([]);
          expect(message.attachments.length).toBe(written.attachments);
          expect(message.text).not.toMatch(/nobody should see|\bno\b/);
          // Attached text counts only where there is no other.
          if (written.texts.length > 0) {
            for (const word of written.attachedWords) expect(message.text).not.toContain(word);
          }
        }),
        runs(0.25),
      ),
    timeoutMs,
  );

  test(
    'however the bytes come in, the message is the same',
    () =>
      fc.assert(
        fc.asyncProperty(
          tree,
          lineEnd,
          fc.integer({ min: 1, max: 400 }),
          damage,
          async (root, eol, size, changes) => {
            let { raw } = writeMail(root, eol);
            for (const change of changes) raw = mutate(raw, change);
            expect(await parsed(inPieces(raw, size))).toEqual(await parsed(raw));
          },
        ),
        runs(0.05),
      ),
    timeoutMs,
  );

  test(
    'mailparser finds no text and no header that is not found here',
    () =>
      fc.assert(
        fc.asyncProperty(tree, lineEnd, async (root, eol) => {
          const { raw, texts } = writeMail(root, eol);
          const message = await parsed(raw);
          const other = await simpleParser(raw, { skipHtmlToText: true, skipTextToHtml: true });
          const found = `${other.text ?? ''} ${other.html || ''}`;
          const words = texts.flatMap((text) => text.words).filter((word) => found.includes(word));
          expect(words.filter((word) => !message.text.includes(word))).toEqual([]);
          expect(message.subject).toBe(other.subject);
          expect(message.from?.address).toBe(other.from?.value[0]?.address);
        }),
        runs(0.05),
      ),
    timeoutMs,
  );

  test(
    'damage inside one part loses no text of the others',
    () =>
      fc.assert(
        fc.asyncProperty(
          tree.filter((root) => root.kind === 'branch'),
          lineEnd,
          fc.nat(),
          fc.array(mutation, { minLength: 1, maxLength: 3 }),
          async (root, eol, which, mutations) => {
            const { raw, texts } = writeMail(root, eol);
            if (texts.length < 2) return;
            const victim = texts[which % texts.length]!;
            let damaged = raw;
            let end = victim.end;
            for (const change of mutations) {
              if (end <= victim.start) break;
              const next = mutate(damaged, change, victim.start, end);
              end += next.length - damaged.length;
              damaged = next;
            }
            // The line end before the next boundary belongs to the boundary (RFC 2046 section 5.1.1).
            damaged = Buffer.concat([damaged.subarray(0, end), Buffer.from(eol), damaged.subarray(end)]);
            const message = await parsed(damaged);
            expectSound(message);
            expect(
              lostTexts(
                message,
                texts.filter((text) => text !== victim),
              ),
            ).toEqual([]);
          },
        ),
        runs(0.25),
      ),
    timeoutMs,
  );

  test(
    'damage anywhere gives a sound message',
    () =>
      fc.assert(
        fc.asyncProperty(
          tree,
          lineEnd,
          fc.array(mutation, { minLength: 1, maxLength: 8 }),
          async (root, eol, mutations) => {
            let { raw } = writeMail(root, eol);
            for (const change of mutations) raw = mutate(raw, change);
            expectSound(await parsed(raw));
          },
        ),
        runs(0.3),
      ),
    timeoutMs,
  );

  test(
    'bytes of any kind give a sound message',
    () =>
      fc.assert(
        fc.asyncProperty(fc.uint8Array({ maxLength: 3000 }), async (bytes) => {
          expectSound(await parsed(bytes));
        }),
        runs(0.02),
      ),
    timeoutMs,
  );
});

/** Markup with known visible and hidden words, well formed. */
const hidingAttributes = [
  'hidden',
  'style="display:none"',
  'style="color:#fff"',
  'style="font-size:0"',
  'style="visibility:hidden"',
  'class="gone"',
  'style="opacity:0"',
];
interface Node {
  readonly tag: string;
  readonly hiding: string | null;
  readonly children: readonly (Node | string)[];
}
const { node } = fc.letrec<{ node: Node }>((tie) => ({
  node: fc.record({
    tag: fc.constantFrom('div', 'p', 'span', 'b', 'section', 'font'),
    hiding: fc.option(fc.constantFrom(...hidingAttributes), { freq: 4 }),
    children: fc.array(
      fc.oneof({ depthSize: 'small', maxDepth: 5 }, fc.constantFrom('word', 'Zähler', '水'), tie('node')),
      { maxLength: 4 },
    ),
  }),
}));

describe(`generated HTML (seed ${seed})`, () => {
  test(
    'visible words are found, hidden words are not',
    () =>
      fc.assert(
        fc.property(node, (root) => {
          tally.cases++;
          const visible: string[] = [];
          const hidden: string[] = [];
          let count = 0;
          const write = ({ tag, hiding, children }: Node, isHidden: boolean): string => {
            const inside = children.map((child) => {
              if (typeof child !== 'string') return write(child, isHidden || hiding !== null);
              const word = `${child}n${count++}n`;
              (isHidden || hiding !== null ? hidden : visible).push(word);
              return ` ${word} `;
            });
            // A paragraph ends where a block begins, so blocks stand in divisions here.
            const name = tag === 'p' ? 'div' : tag;
            return `<${name}${hiding === null ? '' : ` ${hiding}`}>${inside.join('')}</${name}>`;
          };
          const html = `<style>.gone{display:none}</style>${write(root, false)}`;
          const text = readHtml(html, '1', new Defects())
            .segments.map((segment) => segment.text)
            .join(' ');
          expect(visible.filter((word) => !text.includes(word))).toEqual([]);
          expect(hidden.filter((word) => text.includes(word))).toEqual([]);
        }),
        runs(0.05),
      ),
    timeoutMs,
  );
});

describe(`generated forms (seed ${seed})`, () => {
  test(
    'any JSON gives a sound message',
    () =>
      fc.assert(
        fc.property(
          fc.oneof(
            fc.json(),
            fc
              .record({
                form: fc.string(),
                at: fc.anything(),
                from: fc.string(),
                fields: fc.dictionary(fc.string(), fc.jsonValue()),
              })
              .map((data) => JSON.stringify(data)),
            fc.string({ unit: 'binary' }),
          ),
          (json) => {
            tally.cases++;
            const message = parseForm(Buffer.from(json));
            expect(message.text === '').toBe(message.ownText === '');
            expect(/[^\P{Cc}\t\n]|\p{Surrogate}/u.test(message.text)).toBe(false);
            for (const name of Object.keys(message.form!.fields)) expect(/\p{Cc}/u.test(name)).toBe(false);
          },
        ),
        runs(0.03),
      ),
    timeoutMs,
  );
});

const foreign = readForeignMail();
if (foreign === null) {
  console.log("left out: CPython's e-mail test messages, as this machine has no Python with its tests");
} else {
  describe("CPython's own e-mail test messages", () => {
    // RFC 2046 section 5.2.3: what stands below the second header of an external body is no text of the message.
    const notText = new Set(['msg_36.txt']);

    test.each(foreign.map((reading) => [reading.file.split('/').pop()!, reading] as const))(
      '%s: the same subject and every word of its text parts',
      async (name, { file, subject, text }) => {
        const message = await parsed(readFileSync(file));
        expectSound(message);
        expect(message.subject).toBe(subject.replace(/\s+/g, ' ').trim());
        const words = text.match(/[\p{L}\p{N}]{2,}/gu) ?? [];
        expect(notText.has(name) ? [] : words.filter((word) => !message.text.includes(word))).toEqual([]);
      },
    );
  });
}
