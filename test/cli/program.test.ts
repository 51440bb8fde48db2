import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { lay, runCli } from './run-cli.ts';

let root: string;
beforeEach(async () => {
  root = await mkdtemp(join(tmpdir(), 'tallypost-program-'));
});
afterEach(() => rm(root, { recursive: true, force: true }));

const commands = [
  'demo',
  'init',
  'run',
  'confirm',
  'explain',
  'replay',
  'compact',
  'report',
  'recount',
  'erase',
  'undo',
  'queue',
  'restore',
  'cost',
  'intake',
  'desk',
];

describe('the command line', () => {
  it('lists every command in its help and ends with 0', async () => {
    const { code, out } = await runCli('--help');
    expect(code).toBe(0);
    for (const name of commands) expect(out).toMatch(new RegExp(`^  ${name}\\b`, 'm'));
  });
  it.each(commands)('says what %s takes, --json among it', async (name) => {
    const { code, out } = await runCli(name, '--help');
    expect(code).toBe(0);
    if (name !== 'queue') expect(out).toContain('--json');
  });
  it.each(['rename', 'merge', 'retire', 'open'])('has a dry run of queue %s', async (name) => {
    const { out } = await runCli('queue', name, '--help');
    expect(out).toContain('--dry-run');
  });
  it('has a dry run of every command that changes what was learned', async () => {
    for (const name of ['compact', 'recount', 'erase', 'undo', 'restore'])
      expect((await runCli(name, '--help')).out).toContain('--dry-run');
  });
  it('says how a queue is split, for which there is no command', async () => {
    const { out } = await runCli('queue', '--help');
    expect(out.replaceAll(/\s+/g, ' ')).toContain('open the new queue and confirm its messages again');
    expect((await runCli('queue', 'split', 'leaks')).code).toBe(2);
  });
  it('tells its version, and leaves --version of a command to that command', async () => {
    expect((await runCli('--version')).out.trim()).toMatch(/^\d+\.\d+\.\d+$/);
    const { code, err } = await runCli('restore', '--store', join(root, 'none'), '--version', '3');
    expect(code).toBe(2);
    expect(err).toContain('store-missing');
  });

  it.each([
    ['no command', []],
    ['an unknown command', ['fly']],
    ['an unknown option', ['run', '--store', 's', '--fast']],
    ['a missing option', ['run']],
    ['a missing argument', ['explain', '--store', 's']],
    ['an argument too many', ['recount', '--store', 's', 'x']],
    ['a number that is none', ['restore', '--store', 's', '--version', 'last']],
    ['a number out of range', ['run', '--store', 's', '--every', '0']],
    ['a wrong number of messages', ['demo', '--messages', '1']],
    ['a share above one', ['cost', '--messages', '9', '--mail-share', '2']],
  ])('refuses %s with 2 and says so on stderr', async (_, args) => {
    const { code, out, err } = await runCli(...args);
    expect(code).toBe(2);
    expect(out).toBe('');
    expect(err).not.toBe('');
  });

  it.each([
    ['a store that is not there', ['run', '--store', 'ABSENT'], 'store-missing'],
    ['a file for a store', ['run', '--store', 'file'], 'store-missing'],
    ['a directory without a desk', ['run', '--store', 'empty'], 'desk-missing'],
    ['a desk that is no JSON', ['run', '--store', 'broken'], 'desk-not-json'],
    ['a desk without queues', ['recount', '--store', 'queueless'], 'desk-invalid'],
    ['another scheme', ['run', '--store', 'ftp://x/y'], 'place-refused'],
    ['an S3 place without a bucket', ['run', '--store', 's3://'], 'place-refused'],
    ['a history that is not there', ['replay', '--learn', 'ABSENT'], 'history-missing'],
    ['a history of another kind', ['replay', '--learn', 'file'], 'history-unknown'],
    ['an empty history', ['replay', '--learn', 'empty.jsonl'], 'history-empty'],
    ['a history of which nothing is usable', ['replay', '--learn', 'bad.jsonl'], 'history-empty'],
    ['a table without the columns', ['replay', '--learn', 'bad.csv'], 'csv-columns'],
    ['a desk file that is not there', ['replay', '--learn', 'bad.csv', '--desk', 'ABSENT'], 'file-missing'],
    ['two ways of scoring', ['replay', '--learn', 'a', '--score', 'b', '--progressive'], 'usage'],
    [
      'a time that is none',
      ['undo', '--store', 'empty', '--by', 'a', '--since', 'now', '--until', 'now'],
      'usage',
    ],
    [
      'a period that ends before it begins',
      ['undo', '--store', 'empty', '--by', 'a', '--since', '2026-02-01', '--until', '2026-01-01'],
      'usage',
    ],
    ['a demo in a directory in use', ['demo', '--dir', 'used'], 'demo-missing'],
    ['a desk to begin with that is broken', ['init', '--store', 'new', '--desk', 'bad.csv'], 'desk-not-json'],
  ])('refuses %s with 2, what, where, expected and got', async (_, args, code) => {
    await lay(root, {
      file: 'x',
      'empty/readme.txt': 'x',
      'used/readme.txt': 'x',
      'broken/config/desk.json': '{',
      'queueless/config/desk.json': '{"version":1,"name":"x","queues":[],"costs":{}}',
      'empty.jsonl': '',
      'bad.jsonl': '{}\n{',
      'bad.csv': 'a,b\n1,2\n',
    });
    // Paths are given below the temporary root, so that no test touches the directory it runs in.
    const placed = args.map((arg, i) =>
      /^--(store|learn|score|desk|dir)$/.test(args[i - 1] ?? '') && !arg.includes('://')
        ? join(root, arg)
        : arg,
    );
    const plain = await runCli(...placed);
    expect(plain.code).toBe(2);
    expect(plain.out).toBe('');
    expect(plain.err).toMatch(new RegExp(`^${code} at .+\\n  expected  .+\\n  got       .+`));
    const asJson = await runCli(...placed, '--json');
    expect(asJson.code).toBe(2);
    expect(asJson.err).toBe('');
    expect(Object.keys(asJson.json().error)).toEqual(['code', 'place', 'expected', 'got']);
    expect(asJson.json().error.code).toBe(code);
  });
});

describe('cost', () => {
  it('adds a month up, line by line', async () => {
    const { code, json } = await runCli('cost', '--messages', '100000', '--mail-share', '1', '--json');
    expect(code).toBe(0);
    const { lines, totalDollars } = json();
    // 100,000 mails at $100 a million.
    expect(lines.find((line: { what: string }) => line.what === 'mail received').dollars).toBeCloseTo(10, 9);
    expect(totalDollars).toBeCloseTo(
      lines.reduce((sum: number, line: { dollars: number }) => sum + line.dollars, 0),
      9,
    );
  });
  it('is shown as a table for people', async () => {
    const { out } = await runCli('cost', '--messages', '1000');
    expect(out).toMatch(/\$\d+\.\d\d +a month +1,000 messages/);
  });
});
