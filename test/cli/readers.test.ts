import { mkdir, mkdtemp, rm, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import type { Labelled, Unusable } from '../../src/cli/labelled/labelled.ts';
import { readTime } from '../../src/cli/labelled/labelled.ts';
import { readLabelled } from '../../src/cli/labelled/read-labelled.ts';
import { readLines } from '../../src/cli/labelled/read-lines.ts';
import { separatorTimeMs } from '../../src/cli/labelled/read-mbox.ts';

let root: string;
beforeEach(async () => {
  root = await mkdtemp(join(tmpdir(), 'tallypost-readers-'));
});
afterEach(() => rm(root, { recursive: true, force: true }));

async function lay(files: Record<string, string | Uint8Array>): Promise<string> {
  for (const [name, content] of Object.entries(files)) {
    await mkdir(dirname(join(root, name)), { recursive: true });
    await writeFile(join(root, name), content);
  }
  return root;
}

async function readAll(path: string) {
  const items: Labelled[] = [];
  const faults: Unusable['fault'][] = [];
  for await (const element of readLabelled(path)) {
    if (element.kind === 'item') items.push(element);
    else faults.push(element.fault);
  }
  return { items, faults };
}

/** label, content, place below the root. */
function shown(item: Labelled) {
  const bytes = item.content.kind === 'mail' ? item.content.raw : item.content.json;
  return [item.label, Buffer.from(bytes).toString('utf8'), item.place.slice(root.length + 1)];
}

describe('lines of a stream', () => {
  async function linesOf(chunks: string[], max = 100) {
    const lines = [];
    const source = (async function* () {
      for (const chunk of chunks) yield Buffer.from(chunk);
    })();
    for await (const line of readLines(source, max))
      lines.push([line.number, line.bytes === null ? null : line.bytes.toString()]);
    return lines;
  }
  it('are the same wherever the chunks are cut', async () => {
    const expected = [
      [1, 'one'],
      [2, ''],
      [3, 'three'],
    ];
    expect(await linesOf(['one\n\nthree\n'])).toEqual(expected);
    expect(await linesOf(['o', 'ne', '\r', '\n', '\r\nth', 'ree'])).toEqual(expected);
  });
  it('longer than the bound lose their bytes but keep their number', async () => {
    expect(await linesOf(['1234', '56\nab\n'], 5)).toEqual([
      [1, null],
      [2, 'ab'],
    ]);
  });
});

describe('times', () => {
  it.each([
    ['2026-03-01T10:00:00Z', 1772359200000],
    ['2026-03-01', 1772323200000],
    [1772359200, 1772359200000],
    [1772359200000, 1772359200000],
  ])('%s is read', (given, ms) => {
    // date -u -d 2026-03-01T10:00:00Z +%s = 1772359200
    expect(readTime(given)).toBe(ms);
  });
  it.each([['yesterday'], [''], [-1], [Number.NaN], [true], [null], ['10:00']])('%s is none', (given) => {
    expect(readTime(given)).toBeNull();
  });
  it.each([
    // RFC 4155 appendix A: timestamp in UTC, asctime form. date -u -d '2005-09-01 12:34:56' +%s = 1125578096
    ['From someone@example.com Thu Sep  1 12:34:56 2005', 1125578096000],
    ['From someone at example.com  Thu Sep  1 12:34 2005', 1125578040000],
    ['From - Thu Sep 01 14:34:56 2005 +0200', 1125578096000],
    ['From - Thu Sep 01 14:34:56 +0200 2005', 1125578096000],
    ['From MAILER-DAEMON Thu Sep  1 12:34:56 UTC 2005', 1125578096000],
  ])('of the separator %s are read', (line, ms) => {
    expect(separatorTimeMs(line)).toBe(ms);
  });
  it.each(['From now on we meet on Thu', 'From Thu Sep 1 2005', 'From someone@example.com'])(
    'are none in %s',
    (line) => {
      expect(separatorTimeMs(line)).toBeNull();
    },
  );
});

describe('JSON lines', () => {
  it.each([
    ['mail', '{"queue":"a","mail":"Subject: x\\r\\n\\r\\nhi"}', ['a', 'Subject: x\r\n\r\nhi', 'h.jsonl:1']],
    [
      'form',
      '{"queue":"b","form":{"id":"contact","fields":{"text":"hi","n":3,"none":null,"both":["x","y"]}}}',
      ['b', '{"form":"contact","fields":{"text":"hi","n":"3","both":"x\\ny"}}', 'h.jsonl:1'],
    ],
    [
      'form with a time',
      '{"queue":"b","at":"2026-03-01T10:00:00Z","form":{"id":"c","fields":{}}}',
      ['b', '{"form":"c","at":"2026-03-01T10:00:00.000Z","fields":{}}', 'h.jsonl:1'],
    ],
    ['number for a label, other members', '{"queue":7,"mail":"m","x":[1]}', ['7', 'm', 'h.jsonl:1']],
    ['byte order mark', '\uFEFF{"queue":"a","mail":"m"}', ['a', 'm', 'h.jsonl:1']],
  ])('give a message: %s', async (_, line, expected) => {
    await lay({ 'h.jsonl': `${line}\n` });
    const { items, faults } = await readAll(join(root, 'h.jsonl'));
    expect(faults).toEqual([]);
    expect(items.map(shown)).toEqual([expected]);
  });

  it('keep bytes that were not UTF-8 when written with surrogate escapes', async () => {
    await lay({ 'h.jsonl': '{"queue":"a","mail":"caf\\udce9 \\ud83d\\ude00"}\n' });
    const { items } = await readAll(join(root, 'h.jsonl'));
    const content = items[0]!.content;
    // 0xE9 is e with acute in ISO 8859-1; F0 9F 98 80 is U+1F600 in UTF-8.
    expect(content.kind === 'mail' && Buffer.from(content.raw).toString('hex')).toBe('636166e920f09f9880');
  });

  it.each([
    ['{"queue":"a"', 'json-unreadable'],
    ['[]', 'record-not-object'],
    ['3', 'record-not-object'],
    ['{"mail":"m"}', 'queue-missing'],
    ['{"queue":"  ","mail":"m"}', 'queue-missing'],
    ['{"queue":null,"mail":"m"}', 'queue-missing'],
    ['{"queue":"a"}', 'content-missing'],
    ['{"queue":"a","mail":5}', 'content-missing'],
    ['{"queue":"a","form":"x"}', 'form-not-object'],
    ['{"queue":"a","form":{"id":5,"fields":{}}}', 'form-id-not-text'],
    ['{"queue":"a","form":{"id":"c"}}', 'fields-not-object'],
    ['{"queue":"a","form":{"id":"c","fields":{"x":{"y":1}}}}', 'field-not-text'],
    ['{"queue":"a","mail":"m","at":"soon"}', 'time-unreadable'],
  ])('report %s as %s with its line, and go on', async (line, code) => {
    await lay({ 'h.jsonl': `{"queue":"a","mail":"first"}\n\n${line}\n{"queue":"a","mail":"last"}` });
    const { items, faults } = await readAll(join(root, 'h.jsonl'));
    expect(items.map((item) => item.place)).toEqual([join(root, 'h.jsonl:1'), join(root, 'h.jsonl:4')]);
    expect(faults.map(({ code, place }) => [code, place])).toEqual([[code, join(root, 'h.jsonl:3')]]);
  });

  it('are read from gzip; a file cut short gives what stood before the cut, and a fault', async () => {
    // Random letters, so that gzip cannot put the whole into its last block.
    let seed = 1;
    const letters = Array.from({ length: 40_000 }, () => {
      seed = (seed * 48271) % 2147483647;
      return String.fromCharCode(97 + (seed % 26));
    }).join('');
    const packed = gzipSync(`{"queue":"a","mail":"m"}\n{"queue":"b","mail":"${letters}"}\n`);
    await lay({ 'whole.jsonl.gz': packed, 'cut.jsonl.gz': packed.subarray(0, packed.length - 2_000) });
    const whole = await readAll(join(root, 'whole.jsonl.gz'));
    expect(whole.items.map((item) => item.label)).toEqual(['a', 'b']);
    expect(whole.faults).toEqual([]);
    const cut = await readAll(join(root, 'cut.jsonl.gz'));
    expect(cut.items.map((item) => item.label)).toEqual(['a']);
    expect(cut.faults.map(({ code }) => code)).toContain('file-unreadable');
  });

  it('in a file that is not gzip at all give one fault', async () => {
    await lay({ 'h.jsonl.gz': 'plain text' });
    const { items, faults } = await readAll(join(root, 'h.jsonl.gz'));
    expect(items).toEqual([]);
    expect(faults.map(({ code }) => code)).toEqual(['file-unreadable']);
  });
});

describe('CSV', () => {
  it('rows are forms of one field; quotes, line ends within them and a byte order mark are read', async () => {
    await lay({ 'h.csv': '\uFEFFtext,queue\r\n"Hello, ""you""\nthere",a\r\nplain,b\r\n' });
    const { items, faults } = await readAll(join(root, 'h.csv'));
    expect(faults).toEqual([]);
    expect(items.map(shown)).toEqual([
      ['a', '{"form":"csv","fields":{"text":"Hello, \\"you\\"\\nthere"}}', 'h.csv:3'],
      ['b', '{"form":"csv","fields":{"text":"plain"}}', 'h.csv:4'],
    ]);
  });
  it('columns may stand in any order, with a time and others', async () => {
    await lay({ 'h.csv': 'id,Queue,AT,Text\n1,a,2026-03-01T10:00:00Z,hello\n' });
    const { items } = await readAll(join(root, 'h.csv'));
    expect(items.map((item) => [item.label, item.atMs])).toEqual([['a', 1772359200000]]);
  });
  it('bad rows are reported with their line, the rest is read', async () => {
    await lay({ 'h.csv': 'text,queue\none,a\ntoo,many,columns\nnone,\nlast,b\n' });
    const { items, faults } = await readAll(join(root, 'h.csv'));
    expect(items.map((item) => item.label)).toEqual(['a', 'b']);
    expect(faults.map(({ code, place }) => [code, place.slice(root.length + 1)])).toEqual([
      ['row-unreadable', 'h.csv:3'],
      ['queue-missing', 'h.csv:4'],
    ]);
  });
  it('a quote that never closes is reported after the rows before it', async () => {
    await lay({ 'h.csv': 'text,queue\none,a\n"open,b\nmore,c\n' });
    const { items, faults } = await readAll(join(root, 'h.csv'));
    expect(items.map((item) => item.label)).toEqual(['a']);
    expect(faults.map(({ got }) => got)).toEqual(['csv quote not closed']);
  });
  it.each([['a,b\n1,2\n'], ['text\nx\n'], ['']])(
    'without the two columns is refused: %j',
    async (content) => {
      await lay({ 'h.csv': content });
      await expect(readAll(join(root, 'h.csv'))).rejects.toMatchObject({ code: 'csv-columns' });
    },
  );
});

describe('mbox', () => {
  const stamp = 'Thu Sep  1 12:34:56 2005';
  it.each([
    ['no message', '', []],
    ['one', `From a@x.example ${stamp}\nSubject: s\n\nbody\n\n`, ['Subject: s\r\n\r\nbody\r\n']],
    ['without a last line end', `From a@x.example ${stamp}\n\nbody`, ['\r\nbody\r\n']],
    ['CR LF', `From a@x.example ${stamp}\r\n\r\nbody\r\n\r\n`, ['\r\nbody\r\n']],
    [
      'a separator that no empty line precedes',
      `From a ${stamp}\n\none\nFrom b ${stamp}\n\ntwo\n`,
      ['\r\none\r\n', '\r\ntwo\r\n'],
    ],
    ['a sentence', `From a ${stamp}\n\n\nFrom now on\n`, ['\r\n\r\nFrom now on\r\n']],
    ['quoted', `From a ${stamp}\n\n>From x\n>>From y\n> From z\n`, ['\r\nFrom x\r\n>From y\r\n> From z\r\n']],
    [
      'separators that carry no time',
      'From a\n\none\n\nFrom b\n\ntwo\nFrom here\n',
      ['\r\none\r\n', '\r\ntwo\r\nFrom here\r\n'],
    ],
  ])('%s', async (_, content, expected) => {
    await lay({ 'box/billing.mbox': content });
    const { items, faults } = await readAll(join(root, 'box'));
    expect(faults).toEqual([]);
    expect(items.map((item) => shown(item)[1])).toEqual(expected);
    for (const item of items) expect(item.label).toBe('billing');
  });
  it('gives the line and the time of each separator', async () => {
    await lay({ 'q.mbox': `From a ${stamp}\n\none\n\nFrom b Thu Sep  1 12:35:56 2005\n\ntwo\n` });
    const { items } = await readAll(join(root, 'q.mbox'));
    expect(items.map((item) => [item.place.slice(root.length + 1), item.atMs])).toEqual([
      ['q.mbox:1', 1125578096000],
      ['q.mbox:5', 1125578156000],
    ]);
  });
  it('text before the first separator is reported once', async () => {
    await lay({ 'q.mbox': `Subject: no\n\nhello\n\nFrom a ${stamp}\n\none\n` });
    const { items, faults } = await readAll(join(root, 'q.mbox'));
    expect(items).toHaveLength(1);
    expect(faults.map(({ code, place }) => [code, place.slice(root.length + 1)])).toEqual([
      ['separator-missing', 'q.mbox:1'],
    ]);
  });
});

describe('folders', () => {
  it('hold queues as folders and as files, in order of names', async () => {
    await lay({
      'h/billing/2.eml': 'two',
      'h/billing/1.eml': 'one',
      'h/billing/2026/3': 'three',
      'h/leaks/a.json': '{"form":"contact","at":"2026-03-01T10:00:00Z","fields":{"text":"wet"}}',
      'h/leaks/b.json': '{"id":"contact","fields":{"text":"dry"}}',
      'h/moves.mbox': 'From a\n\nout\n',
      'h/.hidden/x.eml': 'no',
      'h/notes.txt': 'no',
    });
    const { items, faults } = await readAll(join(root, 'h'));
    expect(faults).toEqual([]);
    expect(items.map(shown)).toEqual([
      ['billing', 'one', 'h/billing/1.eml'],
      ['billing', 'two', 'h/billing/2.eml'],
      ['billing', 'three', 'h/billing/2026/3'],
      [
        'leaks',
        '{"form":"contact","at":"2026-03-01T10:00:00.000Z","fields":{"text":"wet"}}',
        'h/leaks/a.json',
      ],
      ['leaks', '{"form":"contact","fields":{"text":"dry"}}', 'h/leaks/b.json'],
      ['moves', '\r\nout\r\n', 'h/moves.mbox:1'],
    ]);
  });
  it('report what they cannot read and go on', async () => {
    await lay({
      'h/a/1.json': '{',
      'h/a/2.json': '[]',
      'h/a/3.png': 'x',
      'h/a/4.png': 'x',
      'h/b/1.eml': 'm',
    });
    const { items, faults } = await readAll(join(root, 'h'));
    expect(items.map((item) => item.label)).toEqual(['b']);
    expect(faults.map(({ code, got }) => [code, got])).toEqual([
      ['json-unreadable', 'text that is not JSON'],
      ['record-not-object', 'a list'],
      ['file-unknown', '2 files of other endings, left out'],
    ]);
  });
});

it.each([
  ['nothing there', 'absent', 'history-missing'],
  ['a file of another kind', 'h/x.pdf', 'history-unknown'],
  ['a folder of files of other kinds', 'h', 'history-unknown'],
])('a history that is %s is refused', async (_, path, code) => {
  await lay({ 'h/x.pdf': 'x' });
  await expect(readAll(join(root, path))).rejects.toMatchObject({ code });
});
