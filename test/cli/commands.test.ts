import { mkdtemp, readdir, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { deskFile, labelled, lay, mail, runCli } from './run-cli.ts';

let store: string;
beforeEach(async () => {
  store = await mkdtemp(join(tmpdir(), 'tallypost-commands-'));
});
afterEach(() => rm(store, { recursive: true, force: true }));

/** A store with a desk, and with `count` mails that are routed and confirmed for their queue. */
async function learn(count: number, by = 'ann'): Promise<void> {
  await lay(store, { 'config/desk.json': deskFile });
  const items = labelled(count);
  await lay(
    store,
    Object.fromEntries(items.map(({ text }, i) => [`inbound/m${i}.eml`, mail('Request', text)])),
  );
  await runCli('run', '--store', store);
  await lay(
    store,
    Object.fromEntries(
      items.map(({ queue }, i) => {
        const at = new Date(Date.UTC(2026, 2, 1 + i)).toISOString();
        return [`confirmations/c${i}.json`, JSON.stringify({ message: `m${i}.eml`, queue, by, at })];
      }),
    ),
  );
  const { code } = await runCli('run', '--store', store);
  expect(code).toBe(0);
}

const at = ['--store'] as const;
const recountOf = async () => (await runCli('recount', ...at, store, '--json')).json();

describe('init', () => {
  it('makes a store that works, and leaves one that is there alone', async () => {
    const made = await runCli('init', ...at, store, '--json');
    expect(made.code).toBe(0);
    expect(made.json()).toMatchObject({ kind: 'made', desk: 'written', tokenKey: 'written' });
    await lay(store, { 'inbound/a.eml': mail('Hello', 'where is my parcel') });
    expect((await runCli('run', ...at, store, '--json')).json()).toMatchObject({ held: 1, failed: 0 });
    expect((await runCli('init', ...at, store, '--json')).json()).toMatchObject({
      kind: 'nothing-to-do',
      desk: 'kept',
      tokenKey: 'kept',
    });
  });
  it('takes a given desk, and with --dry-run writes nothing', async () => {
    await lay(store, { 'given.json': deskFile });
    const place = join(store, 'new');
    const dry = await runCli(
      'init',
      ...at,
      place,
      '--desk',
      join(store, 'given.json'),
      '--dry-run',
      '--json',
    );
    expect(dry.json()).toMatchObject({ kind: 'dry-run', queues: ['billing', 'leaks', 'moves'] });
    expect(await readdir(store)).toEqual(['given.json']);
  });
});

describe('run', () => {
  it('routes, holds, guards and folds what waits, once', async () => {
    await lay(store, {
      'config/desk.json': deskFile,
      'inbound/a.eml': mail('Bill', 'my bill is wrong'),
      'inbound/b.eml': mail('Help', 'there is danger to life here'),
      'confirmations/c.json': '{"message":"a.eml","queue":"billing","by":"ann","at":"2026-03-02T11:00:00Z"}',
    });
    const first = await runCli('run', ...at, store, '--json');
    expect(first.code).toBe(0);
    expect(first.json()).toMatchObject({
      routed: 0,
      held: 1,
      guarded: 1,
      confirmed: 1,
      refused: 0,
      failed: 0,
    });
    const second = await runCli('run', ...at, store);
    expect([second.code, second.out.trim()]).toEqual([0, 'nothing waited']);
  });
  it('ends with 1 when a confirmation was refused, and says so on stderr', async () => {
    await lay(store, {
      'config/desk.json': deskFile,
      'confirmations/c.json': '{"message":"absent","queue":"billing","by":"ann","at":"2026-03-02T11:00:00Z"}',
      'confirmations/d.json': '{',
    });
    const ran = await runCli('run', ...at, store);
    expect(ran.code).toBe(1);
    expect(ran.out).toContain('2 refused');
    expect(ran.err).toContain('message-missing');
    expect(ran.err).toContain('confirmation-invalid');
  });
});

describe('confirm', () => {
  it('drops what the next run folds; a dry run drops nothing', async () => {
    await learn(3);
    await lay(store, { 'inbound/new.eml': mail('Bill', 'my bill again') });
    const args = ['confirm', ...at, store, 'inbound/new.eml', 'billing', '--by', 'ben', '--json'];
    expect((await runCli(...args, '--dry-run')).json()).toMatchObject({ kind: 'dry-run', key: null });
    const dropped = (await runCli(...args, '--at', '2026-03-03T10:00:00Z')).json();
    expect(dropped.confirmation).toEqual({
      message: 'new.eml',
      queue: 'billing',
      by: 'ben',
      at: '2026-03-03T10:00:00.000Z',
    });
    expect((await runCli('run', ...at, store, '--json')).json()).toMatchObject({ confirmed: 1 });
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 4 });
  });
  it.each([
    ['a queue that the desk does not have', 'm0.eml', 'sewers', 'queue-unknown'],
    ['a message that does not exist', 'none.eml', 'billing', 'message-missing'],
  ])('refuses %s', async (_, message, queue, code) => {
    await learn(3);
    const ran = await runCli('confirm', ...at, store, message, queue, '--by', 'ben', '--json');
    expect(ran.code).toBe(2);
    expect(ran.json().error.code).toBe(code);
  });
});

describe('explain', () => {
  it('weighs words for and against; the parts add up to the log odds', async () => {
    await learn(45);
    const { code, json } = await runCli('explain', ...at, store, 'm0.eml', '--json');
    expect(code).toBe(0);
    const { now, balance, written } = json();
    expect(written.decision).toBe('held');
    expect(now.posteriors[0].queue).toBe('billing');
    expect(balance.queue).toBe('billing');
    const items = balance.groups.flatMap((group: { items: { decibans: number }[] }) => group.items);
    const sum = items.reduce((total: number, item: { decibans: number }) => total + item.decibans, 0);
    expect(sum).toBeCloseTo(balance.decibans, 9);
    const words = balance.groups.find((group: { kind: string }) => group.kind === 'word').items;
    expect(words.find((item: { label: string }) => item.label === 'bill').decibans).toBeGreaterThan(0);
    // A posterior of 0.8 against 0.1 is 10 log10(8) = 9.03 decibans: the same two numbers say the same.
    const [first, second] = now.posteriors;
    expect(10 * Math.log10(first.posterior / second.posterior)).toBeCloseTo(balance.decibans, 6);
  });
  it('weighs the queues that are asked for, in words for people', async () => {
    await learn(45);
    const { out } = await runCli('explain', ...at, store, 'm1.eml', '--queue', 'leaks', '--against', 'moves');
    expect(out).toContain('leaks against moves: +');
    expect(out).toMatch(/^\s+\+\d+\.\d {4}water$/m);
  });
  it.each([
    ['a message that does not exist', ['none'], 'message-missing'],
    ['a queue that the desk does not have', ['m0.eml', '--queue', 'sewers'], 'queue-unknown'],
  ])('refuses %s', async (_, args, code) => {
    await learn(3);
    const ran = await runCli('explain', ...at, store, ...args, '--json');
    expect([ran.code, ran.json().error.code]).toEqual([2, code]);
  });
});

describe('compact and recount', () => {
  it('make one table of all segments, equal to the recount', async () => {
    await learn(9);
    const dry = await runCli('compact', ...at, store, '--dry-run', '--json');
    expect(dry.json().compaction).toMatchObject({ kind: 'dry-run', messages: 9 });
    const done = await runCli('compact', ...at, store, '--json');
    expect(done.json().compaction).toMatchObject({ kind: 'compacted', messages: 9 });
    expect((await runCli('compact', ...at, store)).out).toContain('nothing was learned');
    expect((await runCli('compact', ...at, store, '--force', '--json')).json().compaction.kind).toBe(
      'compacted',
    );
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 9, differences: [], repair: 'none' });
  });
  it('a table that was altered is found, told with exit code 1, and repaired', async () => {
    await learn(9);
    await runCli('compact', ...at, store);
    await breakBase();
    const found = await runCli('recount', ...at, store);
    expect(found.code).toBe(1);
    expect(found.out).toContain('the table cannot be read');
    const dry = await runCli('recount', ...at, store, '--repair', '--dry-run', '--json');
    expect([dry.code, dry.json().repair]).toEqual([1, 'none']);
    expect((await recountOf()).fault).not.toBeNull();
    const repaired = await runCli('recount', ...at, store, '--repair', '--json');
    expect([repaired.code, repaired.json().repair]).toEqual([0, 'repaired']);
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 9 });
  });
});

/** Writes other bytes over the base, through the store as a mistaken program would. */
async function breakBase(): Promise<void> {
  const { createDirectoryStore } = await import('../../src/store/directory.ts');
  const opened = createDirectoryStore(store);
  for await (const { key } of opened.list('model/bases/')) await opened.put(key, Buffer.from('other bytes'));
}

describe('erase', () => {
  it('takes the message out of counts and store; a dry run does not', async () => {
    await learn(9);
    const dry = await runCli('erase', ...at, store, 'm4.eml', '--dry-run', '--json');
    expect(dry.json().erasures).toMatchObject([{ message: 'm4.eml', kind: 'dry-run', confirmations: 1 }]);
    expect(await recountOf()).toMatchObject({ messages: 9 });
    const done = await runCli('erase', ...at, store, 'inbound/m4.eml', 'm5.eml', '--json');
    expect(done.code).toBe(0);
    expect(done.json()).toMatchObject({ isDone: true, erasures: [{ kind: 'erased' }, { kind: 'erased' }] });
    expect(await readdir(join(store, 'inbound'))).not.toContain('m4.eml');
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 7 });
    const again = await runCli('erase', ...at, store, 'm4.eml');
    expect([again.code, again.out.includes('nothing of it was there')]).toEqual([0, true]);
  });
});

describe('undo', () => {
  it('takes back what one person said in a period', async () => {
    await learn(9);
    // Confirmed on 1 to 9 March; 3, 4 and 5 March lie in the period.
    const args = [
      'undo',
      ...at,
      store,
      '--by',
      'ann',
      '--since',
      '2026-03-03',
      '--until',
      '2026-03-06',
      '--json',
    ];
    expect((await runCli(...args, '--dry-run')).json()).toMatchObject({ kind: 'dry-run', confirmations: 3 });
    expect((await runCli(...args)).json()).toMatchObject({ kind: 'undone', messages: 3, isDone: true });
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 6 });
    expect((await runCli(...args)).json()).toMatchObject({ messages: 0 });
  });
  it('says how what was right can be confirmed again, and it can', async () => {
    await learn(3);
    const period = ['--since', '2026-03-01', '--until', '2026-03-02'];
    const undone = await runCli('undo', ...at, store, '--by', 'ann', ...period);
    expect(undone.out).toContain('must be confirmed with a later time');
    expect(await recountOf()).toMatchObject({ messages: 2 });
    const confirm = (time: string) =>
      runCli('confirm', ...at, store, 'm0.eml', 'billing', '--by', 'ann', '--at', time);
    await confirm('2026-03-01T00:00:00.000Z');
    await runCli('run', ...at, store);
    expect(await recountOf()).toMatchObject({ messages: 2 });
    await confirm('2026-03-01T00:00:01.000Z');
    await runCli('run', ...at, store);
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 3 });
  });
  it('leaves the confirmations of others', async () => {
    await learn(3);
    const ran = await runCli(
      'undo',
      ...at,
      store,
      '--by',
      'ben',
      '--since',
      '2026-01-01',
      '--until',
      '2027-01-01',
    );
    expect(ran.out).toContain('0 confirmations of ben on 0 messages');
    expect(await recountOf()).toMatchObject({ messages: 3 });
  });
});

describe('queue', () => {
  it('renames, merges, retires and opens, counts and desk file together', async () => {
    await learn(9);
    const change = async (...args: string[]) =>
      (await runCli('queue', ...args, ...at, store, '--json')).json();
    expect(await change('rename', 'leaks', 'bursts', '--dry-run')).toMatchObject({
      kind: 'dry-run',
      messages: 3,
    });
    expect(await change('rename', 'leaks', 'bursts', '--title', 'Bursts')).toMatchObject({
      kind: 'changed',
      messages: 3,
      deskFile: 'updated',
    });
    expect(await change('merge', 'moves', 'billing')).toMatchObject({ kind: 'changed', messages: 3 });
    expect(await change('open', 'water', '--title', 'Water', '--wrong-minutes', '20')).toMatchObject({
      kind: 'changed',
      deskFile: 'updated',
    });
    expect(await change('retire', 'bursts', 'water')).toMatchObject({ kind: 'changed', messages: 3 });
    const { now } = (await runCli('explain', ...at, store, 'm0.eml', '--json')).json();
    expect(now.posteriors.map((each: { queue: string }) => each.queue).sort()).toEqual(['billing', 'water']);
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 9 });
  });
  it.each([
    ['a queue that is not there', ['rename', 'sewers', 'drains']],
    ['a name in use', ['rename', 'leaks', 'billing']],
    ['a merge into itself', ['merge', 'leaks', 'leaks']],
    ['a name of other letters', ['open', 'New Queue', '--title', 'x']],
  ])('refuses %s', async (_, args) => {
    await learn(3);
    const ran = await runCli('queue', ...args, ...at, store, '--json');
    expect([ran.code, ran.json().error.code]).toEqual([2, 'queue-refused']);
  });
});

describe('restore', () => {
  it('returns to an earlier version', async () => {
    await learn(6);
    const { version } = await recountOf();
    await lay(store, { 'inbound/late.eml': mail('Bill', 'my late bill') });
    await runCli('run', ...at, store);
    await runCli('confirm', ...at, store, 'late.eml', 'billing', '--by', 'ben');
    await runCli('run', ...at, store);
    expect(await recountOf()).toMatchObject({ messages: 7 });
    const args = ['restore', ...at, store, '--version', String(version), '--json'];
    expect((await runCli(...args, '--dry-run')).json()).toMatchObject({ kind: 'dry-run', segments: 1 });
    expect((await runCli(...args)).json()).toMatchObject({ kind: 'restored', segments: 1 });
    expect(await recountOf()).toMatchObject({ isRight: true, messages: 6 });
  });
  it('refuses a version that never was', async () => {
    await learn(3);
    const ran = await runCli('restore', ...at, store, '--version', '999', '--json');
    expect([ran.code, ran.json().error.code]).toEqual([2, 'version-unknown']);
  });
});

describe('report', () => {
  it('writes a page and its numbers', async () => {
    await learn(9);
    const ran = await runCli('report', ...at, store, '--json');
    expect(ran.code).toBe(0);
    expect(await readdir(join(store, 'reports'))).toEqual(
      expect.arrayContaining(['latest.html', 'latest.json', ran.json().page.slice('reports/'.length)]),
    );
  });
});
