import { execFileSync, spawnSync } from 'node:child_process';
import {
  appendFileSync,
  chmodSync,
  copyFileSync,
  cpSync,
  existsSync,
  linkSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  symlinkSync,
  utimesSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { createDirectoryStore } from '../../src/store/directory.ts';
import { addVersion, readNewest } from '../../src/store/directory-versions.ts';
import type { PutResult, Store } from '../../src/store/store.ts';
import { ask, bundleChild, startChild } from './child.ts';
import { bytes, etagOf, keysOf, text } from './contract.ts';

const root = mkdtempSync(join(tmpdir(), 'tallypost-directory-'));
let writer: string;
beforeAll(async () => {
  writer = await bundleChild('./directory-writer.ts', join(root, 'writer.mjs'));
});
afterAll(() => rmSync(root, { recursive: true, force: true }));

let count = 0;
let directory: string;
let store: Store;
beforeEach(() => {
  directory = join(root, `store-${++count}`);
  store = createDirectoryStore(directory);
});

const versionsOf = (...folders: string[]): string => join(directory, '.tallypost', 'versions', ...folders);
const temporaries = (): string => join(directory, '.tallypost', 'temporary');

async function bodyOf(key: string): Promise<string | null> {
  const got = await store.get(key);
  return got.kind === 'found' ? text(got.object.body) : null;
}

function drop(name: string, body: string): string {
  const path = join(directory, name);
  mkdirSync(join(path, '..'), { recursive: true });
  writeFileSync(path, body);
  return path;
}

/** Every byte of every file below a directory. */
function everyByte(below: string): string {
  return readdirSync(below, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile())
    .map((entry) => readFileSync(join(entry.parentPath, entry.name), 'latin1'))
    .join('\n');
}

describe('files that a person puts into the directory', () => {
  it('are objects without metadata', async () => {
    drop('inbound/letters/Leak in Mill Lane.eml', 'Subject: leak\r\n\r\n');
    drop('confirmations/c1.json', '{}');
    drop('config/desk.json', '{"version":1}');
    expect(await keysOf(store, '')).toEqual([
      'config/desk.json',
      'confirmations/c1.json',
      'inbound/letters/Leak in Mill Lane.eml',
    ]);
    const got = await store.get('inbound/letters/Leak in Mill Lane.eml');
    expect(got).toMatchObject({
      kind: 'found',
      object: { bytes: 17, contentType: 'message/rfc822', metadata: {} },
    });
    const streamed = await store.stream('confirmations/c1.json');
    expect(streamed?.head).toMatchObject({ bytes: 2, contentType: 'application/json' });
  });

  it('take metadata and stay as they were', async () => {
    const path = drop('inbound/a.eml', 'Subject: leak\r\n\r\n');
    const before = statSync(path);
    const head = await store.head('inbound/a.eml');
    const result = await store.replaceMetadata(
      'inbound/a.eml',
      { 'tallypost-queue': 'leaks' },
      { ifMatch: head?.etag as string },
    );
    expect(result.kind).toBe('written');
    expect((await store.head('inbound/a.eml'))?.metadata).toEqual({ 'tallypost-queue': 'leaks' });
    expect(await bodyOf('inbound/a.eml')).toBe('Subject: leak\r\n\r\n');
    expect(statSync(path)).toMatchObject({ ino: before.ino, mtimeMs: before.mtimeMs, size: 17 });
    expect(await keysOf(store, 'inbound/')).toEqual(['inbound/a.eml']);
  });

  it('lose a metadata change to an edit that came first', async () => {
    const path = drop('inbound/a.eml', 'half of');
    const head = await store.head('inbound/a.eml');
    appendFileSync(path, ' the mail');
    expect(
      await store.replaceMetadata('inbound/a.eml', { a: 'b' }, { ifMatch: head?.etag as string }),
    ).toEqual({ kind: 'lost' });
    expect(await bodyOf('inbound/a.eml')).toBe('half of the mail');
  });

  it('are gone after a deletion, and count again when put again', async () => {
    const path = drop('confirmations/c1.json', '{"queue":"a"}');
    await store.delete('confirmations/c1.json');
    expect(existsSync(path)).toBe(false);
    expect(await keysOf(store, '')).toEqual([]);
    drop('confirmations/c1.json', '{"queue":"b"}');
    expect(await bodyOf('confirmations/c1.json')).toBe('{"queue":"b"}');
    expect(await keysOf(store, '')).toEqual(['confirmations/c1.json']);
    await store.delete('confirmations/c1.json');
    expect(await store.head('confirmations/c1.json')).toBeNull();
  });

  it('do not come back when the process died between deletion and removal', async () => {
    const path = drop('confirmations/c1.json', '{}');
    const kept = join(root, `kept-${count}`);
    linkSync(path, kept); // The same file under a second name outlives the deletion.
    await store.delete('confirmations/c1.json');
    renameSync(kept, path);
    expect(await store.head('confirmations/c1.json')).toBeNull();
    expect(await keysOf(store, '')).toEqual([]);
    expect(existsSync(path)).toBe(false); // Listing cleaned up.
  });

  it('do not undo the routing of a message by being copied a second time', async () => {
    const path = drop('inbound/a.eml', 'mail');
    const head = await store.head('inbound/a.eml');
    await store.replaceMetadata(
      'inbound/a.eml',
      { 'tallypost-queue': 'leaks' },
      { ifMatch: head?.etag as string },
    );
    rmSync(path);
    drop('inbound/a.eml', 'mail');
    expect((await store.head('inbound/a.eml'))?.metadata).toEqual({ 'tallypost-queue': 'leaks' });
  });

  it('are edits when they are settings, over what a program wrote', async () => {
    await store.put('config/desk.json', bytes('{"by":"program"}'));
    const path = join(directory, 'config/desk.json');
    expect(readFileSync(path, 'utf8')).toBe('{"by":"program"}');
    writeFileSync(path, '{"by":"person"}');
    expect(await bodyOf('config/desk.json')).toBe('{"by":"person"}');
    const edited = await store.head('config/desk.json');
    const next = etagOf(
      await store.put('config/desk.json', bytes('{"by":"program again"}'), {
        ifMatch: edited?.etag as string,
      }),
    );
    expect((await store.head('config/desk.json'))?.etag).toBe(next);
    expect(readFileSync(path, 'utf8')).toBe('{"by":"program again"}');
    rmSync(path);
    writeFileSync(path, '{"by":"program"}'); // Back to an older text: an edit like any other.
    expect(await bodyOf('config/desk.json')).toBe('{"by":"program"}');
    expect(await store.put('config/desk.json', bytes('x'), { ifMatch: next })).toEqual({ kind: 'lost' });
  });

  it("are not objects when they are hidden, editors' copies, folders, or dangling links", async () => {
    drop('inbound/.DS_Store', 'x');
    drop('inbound/a.eml~', 'x');
    mkdirSync(join(directory, 'inbound/folder'));
    symlinkSync('/nonexistent', join(directory, 'inbound/dangling'));
    const outside = join(root, `outside-${count}.eml`);
    writeFileSync(outside, 'linked');
    symlinkSync(outside, join(directory, 'inbound/linked.eml'));
    expect(await keysOf(store, '')).toEqual(['inbound/linked.eml']);
    expect(await bodyOf('inbound/linked.eml')).toBe('linked');
    await store.delete('inbound/linked.eml');
    expect(readFileSync(outside, 'utf8')).toBe('linked');
  });

  it('survive a copy of the whole directory that loses times', async () => {
    await store.put('inbound/a.eml', bytes('mail'), { metadata: { 'tallypost-queue': 'leaks' } });
    await store.put('config/desk.json', bytes('{}'), { metadata: { kept: 'yes' } });
    await store.put('confirmations/c1.json', bytes('{}'));
    await store.delete('confirmations/c1.json');
    const copy = `${directory}-copy`;
    cpSync(directory, copy, { recursive: true });
    const restored = createDirectoryStore(copy);
    expect((await restored.head('inbound/a.eml'))?.metadata).toEqual({ 'tallypost-queue': 'leaks' });
    expect((await restored.head('config/desk.json'))?.metadata).toEqual({ kept: 'yes' });
    expect(await keysOf(restored, '')).toEqual(['config/desk.json', 'inbound/a.eml']);
  });
});

describe('what a person sees in the directory', () => {
  it('is each message, setting and report as a plain file with its current body', async () => {
    for (const key of ['inbound/in/a.eml', 'config/desk.json', 'reports/2026-03-01.html']) {
      await store.put(key, bytes('first'));
      await store.put(key, bytes('second'));
      expect(readFileSync(join(directory, key), 'utf8')).toBe('second');
    }
    await store.delete('reports/2026-03-01.html');
    expect(existsSync(join(directory, 'reports/2026-03-01.html'))).toBe(false);
  });

  it('keeps the key readable in the names of the version files, one for each object', async () => {
    await store.put('model/manifest.json', bytes('1'));
    await store.put('model/manifest.json', bytes('2'));
    await store.put('model/manifest.json', bytes('3'), { metadata: { a: 'b' } });
    expect(readdirSync(versionsOf('model', 'manifest.json@'))).toEqual(['3']);
    const file = readFileSync(versionsOf('model', 'manifest.json@', '3'), 'utf8');
    expect(file.slice(file.indexOf('\n') + 1)).toBe('3');
    expect(JSON.parse(file.slice(0, file.indexOf('\n')))).toMatchObject({
      contentType: 'application/json',
      metadata: { a: 'b' },
      bodyBytes: 1,
    });
    expect(readdirSync(temporaries())).toEqual([]);
  });

  it('holds no byte of an object once it is replaced or deleted', async () => {
    await store.put('inbound/a.eml', bytes('canary-one'));
    await store.put('inbound/a.eml', bytes('canary-two'), { metadata: { note: 'canary-three' } });
    expect(everyByte(directory)).not.toContain('canary-one');
    expect(everyByte(directory)).toContain('canary-two');
    await store.delete('inbound/a.eml');
    drop('inbound/b.eml', 'canary-four');
    const head = await store.head('inbound/b.eml');
    await store.replaceMetadata('inbound/b.eml', { note: 'canary-five' }, { ifMatch: head?.etag as string });
    await store.delete('inbound/b.eml');
    expect(everyByte(directory)).not.toContain('canary');
  });

  it('is no view where a key makes no file name or a folder is in its place', async () => {
    await store.put('inbound/a:b?.eml', bytes('odd'));
    await store.put('inbound/folder/x', bytes('below'));
    await store.put('inbound/folder', bytes('same name'));
    expect(await bodyOf('inbound/a:b?.eml')).toBe('odd');
    expect(await bodyOf('inbound/folder')).toBe('same name');
    expect(await keysOf(store, '')).toEqual(['inbound/a:b?.eml', 'inbound/folder', 'inbound/folder/x']);
    expect(readdirSync(join(directory, 'inbound'))).toEqual(['folder']);
    expect(readdirSync(temporaries())).toEqual([]);
  });

  it('shows the current body again after a view of an older one came late', async () => {
    await store.put('reports/a.html', bytes('old'));
    const late = join(root, `late-${count}`);
    cpSync(join(directory, 'reports/a.html'), late, { preserveTimestamps: true });
    await store.put('reports/a.html', bytes('new'));
    copyFileSync(late, join(directory, 'reports/a.html'));
    expect(await bodyOf('reports/a.html')).toBe('new');
    await store.put('reports/a.html', bytes('newer'));
    expect(readFileSync(join(directory, 'reports/a.html'), 'utf8')).toBe('newer');
  });
});

describe('a writer that comes late', () => {
  const write = (number: string, lineage: string[], body: string): void =>
    writeFileSync(
      versionsOf('a@', number),
      `${JSON.stringify({ id: `id${number}`, lineage, isDeleted: false, contentType: '', metadata: {}, plain: null, bodyBytes: body.length })}\n${body}`,
    );
  const header = { id: 'mine', isDeleted: false, contentType: '', metadata: {}, plain: null };

  it('loses although its number is free again, and leaves nothing', async () => {
    await store.put('a', bytes('1'));
    const seen = readNewest(versionsOf('a@'));
    for (const body of ['2', '3', '4']) await store.put('a', bytes(body));
    expect(await addVersion(versionsOf('a@'), temporaries(), seen, header, bytes('late'), () => true)).toBe(
      false,
    );
    expect(readdirSync(versionsOf('a@'))).toEqual(['4']);
    expect(await bodyOf('a')).toBe('4');
  });

  it('loses a creation although number 1 is free again', async () => {
    await store.put('a', bytes('1'));
    await store.put('a', bytes('2'));
    expect(await addVersion(versionsOf('a@'), temporaries(), null, header, bytes('late'), () => true)).toBe(
      false,
    );
    expect(readdirSync(versionsOf('a@'))).toEqual(['2']);
  });

  it('learns that it had won when the next writer was quicker than its check', async () => {
    await store.put('a', bytes('1'));
    const seen = readNewest(versionsOf('a@'));
    // Version 3 stands on version 2, which is this writer's: it won, and was replaced at once.
    const won = addVersion(versionsOf('a@'), temporaries(), seen, header, bytes('2'), () => {
      write('3', ['mine', 'id1'], '3');
      return true;
    });
    expect(await won).toBe(true);
    expect(await bodyOf('a')).toBe('3');
    expect(readdirSync(versionsOf('a@'))).toEqual(['2', '3']);
    await store.put('a', bytes('4'));
    expect(readdirSync(versionsOf('a@'))).toEqual(['4']);
  });

  it('does not write over a plain file that changed meanwhile', async () => {
    await store.put('b', bytes('x'));
    expect(await addVersion(versionsOf('a@'), temporaries(), null, header, bytes('1'), () => false)).toBe(
      false,
    );
    expect(existsSync(versionsOf('a@'))).toBe(false);
    expect(readdirSync(temporaries())).toEqual([]);
  });
});

describe('what crashed processes leave', () => {
  const hoursAgo = (path: string, hours: number): void => {
    const second = Date.now() / 1000 - hours * 3600;
    utimesSync(path, second, second);
  };

  it('is no obstacle: temporary files are ignored and swept after an hour', async () => {
    await store.put('a', bytes('1'));
    writeFileSync(join(temporaries(), '999-young'), 'half');
    writeFileSync(join(temporaries(), '999-old'), 'half');
    hoursAgo(join(temporaries(), '999-old'), 2);
    store = createDirectoryStore(directory);
    await store.put('a', bytes('2'));
    expect(readdirSync(temporaries())).toEqual(['999-young']);
    expect(await keysOf(store, '')).toEqual(['a']);
  });

  it('is no obstacle: an older version below the newest is ignored and swept by a listing after an hour', async () => {
    await store.put('a', bytes('1'));
    linkSync(versionsOf('a@', '1'), join(root, `one-${count}`));
    await store.put('a', bytes('2'));
    renameSync(join(root, `one-${count}`), versionsOf('a@', '1'));
    expect(await bodyOf('a')).toBe('2');
    await keysOf(store, '');
    expect(readdirSync(versionsOf('a@'))).toEqual(['1', '2']);
    hoursAgo(versionsOf('a@', '2'), 2);
    await keysOf(store, '');
    expect(readdirSync(versionsOf('a@'))).toEqual(['2']);
  });

  it('a deletion is swept by a listing after ten minutes, with its folder', async () => {
    await store.put('a', bytes('1'));
    await store.delete('a');
    await keysOf(store, '');
    expect(readdirSync(versionsOf('a@'))).toEqual(['2']);
    hoursAgo(versionsOf('a@', '2'), 0.15);
    await keysOf(store, '');
    expect(readdirSync(versionsOf('a@'))).toEqual(['2']);
    hoursAgo(versionsOf('a@', '2'), 0.2);
    expect(await keysOf(store, '')).toEqual([]);
    expect(existsSync(versionsOf('a@'))).toBe(false);
    expect((await store.put('a', bytes('1'), { ifNoneMatch: '*' })).kind).toBe('written');
  });

  it('an empty version file is a deletion whose text never reached the disk', async () => {
    await store.put('a', bytes('1'));
    writeFileSync(versionsOf('a@', '2'), '');
    expect(await store.head('a')).toBeNull();
    expect((await store.put('a', bytes('again'), { ifNoneMatch: '*' })).kind).toBe('written');
    expect(await bodyOf('a')).toBe('again');
  });

  it.each([
    ['cut', (file: Buffer) => file.subarray(0, file.length - 1)],
    ['longer', (file: Buffer) => Buffer.concat([file, Buffer.from('x')])],
    ['without its header', (file: Buffer) => Buffer.alloc(file.length, 0)],
    ['with a header that is not JSON', (file: Buffer) => Buffer.concat([Buffer.from('x'), file])],
  ])('a version file that is %s is refused with its place', async (_, damage) => {
    await store.put('histories/a', bytes('body'));
    const path = versionsOf('histories', 'a@', '1');
    writeFileSync(path, damage(readFileSync(path)));
    await expect(store.get('histories/a')).rejects.toMatchObject({
      name: 'TallypostError',
      code: 'object-damaged',
      place: path,
    });
  });
});

describe('a directory that refuses', () => {
  it('is an error at the key when a file stands in its place', async () => {
    writeFileSync(directory, 'not a folder');
    await expect(store.put('a/b', bytes('1'))).rejects.toMatchObject({
      name: 'TallypostError',
      code: 'store-refused',
      place: 'a/b',
    });
    expect(readFileSync(directory, 'utf8')).toBe('not a folder');
  });

  it('is an error without permission, and what is there stays', async () => {
    await store.put('a', bytes('1'));
    // The super-user may write anywhere: then a child without rights tries. 65534 is `nobody` on Linux.
    const isRoot = process.getuid?.() === 0;
    chmodSync(root, 0o755);
    if (!isRoot) for (const path of [temporaries(), versionsOf(), versionsOf('a@')]) chmodSync(path, 0o555);
    const child = startChild(writer, [directory], isRoot ? { uid: 65534 } : {});
    const answer = await ask(child, { key: 'a', bytes: 10, options: {} });
    child.disconnect();
    if (!isRoot) for (const path of [temporaries(), versionsOf(), versionsOf('a@')]) chmodSync(path, 0o755);
    expect(answer).toEqual({
      kind: 'threw',
      name: 'TallypostError',
      code: 'store-refused',
      place: 'a',
      got: 'EACCES',
    });
    expect(await bodyOf('a')).toBe('1');
  });

  it('is an error when a file may not grow further, and what is there stays', async () => {
    await store.put('a', bytes('1'));
    // ulimit -f counts blocks of 1,024 bytes: a body of 100,000 bytes stops half way.
    const script = `ulimit -f 32; exec "${process.execPath}" "${writer.replace('writer.mjs', 'once.mjs')}" "${directory}"`;
    await bundleChild('./directory-write-once.ts', writer.replace('writer.mjs', 'once.mjs'));
    const run = spawnSync('bash', ['-c', script], { encoding: 'utf8' });
    expect(run.stdout.trim()).toBe('TallypostError store-full a EFBIG');
    expect(await bodyOf('a')).toBe('1');
    expect(readdirSync(temporaries())).toEqual([]);
    expect((await store.put('a', bytes('2'))).kind).toBe('written');
  });
});

describe('twenty processes', () => {
  it('get one winner in every round of creations and replacements', async () => {
    const children = Array.from({ length: 20 }, () => startChild(writer, [directory]));
    const race = async (key: string, options: object): Promise<PutResult> => {
      const answers = (await Promise.all(
        children.map((child) => ask(child, { key, bytes: 64, options })),
      )) as PutResult[];
      const winners = answers.flatMap((answer, i) => (answer.kind === 'written' ? [i] : []));
      expect(winners).toHaveLength(1);
      expect(answers.filter((answer) => answer.kind === 'lost')).toHaveLength(19);
      const winner = children[winners[0] as number]?.pid as number;
      const got = await store.get(key);
      expect(got.kind === 'found' && got.object.body[0]).toBe(winner % 256);
      return answers[winners[0] as number] as PutResult;
    };
    try {
      let etag = etagOf(await race('model/manifest.json', { ifNoneMatch: '*' }));
      for (let round = 0; round < 25; round += 1)
        etag = etagOf(await race('model/manifest.json', { ifMatch: etag }));
      for (let round = 0; round < 10; round += 1) await race(`model/segments/${round}`, { ifNoneMatch: '*' });
      expect(readdirSync(temporaries())).toEqual([]);
    } finally {
      for (const child of children) child.disconnect();
    }
  });
});

/** A full disk for real, where this process may mount one; the bound on the file's size above stands in elsewhere. */
const canMount = ((): boolean => {
  if (process.getuid?.() !== 0) return false;
  const probe = join(root, 'probe');
  mkdirSync(probe, { recursive: true });
  if (spawnSync('mount', ['-t', 'tmpfs', '-o', 'size=64k', 'tmpfs', probe]).status !== 0) return false;
  execFileSync('umount', [probe]);
  return true;
})();
if (!canMount) process.stdout.write('left out: a full disk, which needs the right to mount one\n');
if (canMount)
  describe('a full disk', () => {
    it('is an error at the key; what is there stays and can be deleted', async () => {
      mkdirSync(directory);
      execFileSync('mount', ['-t', 'tmpfs', '-o', 'size=1m', 'tmpfs', directory]);
      try {
        await store.put('inbound/a', new Uint8Array(300_000).fill(1));
        const full = { name: 'TallypostError', code: 'store-full', place: 'inbound/b', got: 'ENOSPC' };
        await expect(store.put('inbound/b', new Uint8Array(900_000))).rejects.toMatchObject(full);
        expect(await store.head('inbound/b')).toBeNull();
        expect(await store.get('inbound/a')).toMatchObject({ kind: 'found', object: { bytes: 300_000 } });
        expect(readdirSync(temporaries())).toEqual([]);
        await store.delete('inbound/a');
        expect((await store.put('model/b', new Uint8Array(700_000))).kind).toBe('written');
      } finally {
        execFileSync('umount', [directory]);
      }
    });
  });
