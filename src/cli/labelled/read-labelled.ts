import { createReadStream } from 'node:fs';
import { readdir, readFile, stat } from 'node:fs/promises';
import { basename, join } from 'node:path';
import { createGunzip } from 'node:zlib';
import { bounds } from '../../bounds.ts';
import { TallypostError } from '../../errors.ts';
import { bad, type LabelledStream } from './labelled.ts';
import { readCsv } from './read-csv.ts';
import { isObject, kindOf, readFormRecord, readJsonl } from './read-jsonl.ts';
import { readMbox } from './read-mbox.ts';

export const labelledForms =
  'a folder of <queue>/*.eml or *.json, a folder of <queue>.mbox, or a file .jsonl, .jsonl.gz or .csv';

/** The messages of a labelled history, streamed in the history's own order (folders in order of names). Whatever cannot be
 *  read is an element of kind `bad`; reading goes on.
 *  @throws TallypostError history-missing, history-unknown or csv-columns when nothing of `path` can be read. */
export async function* readLabelled(path: string): LabelledStream {
  const found = await stat(path).catch(() => null);
  if (found === null)
    throw new TallypostError({
      code: 'history-missing',
      place: path,
      expected: labelledForms,
      got: 'nothing there',
    });
  if (found.isDirectory()) yield* readFolder(path);
  else {
    const stream = readFileAs(path);
    if (stream === null)
      throw new TallypostError({
        code: 'history-unknown',
        place: path,
        expected: labelledForms,
        got: 'a file of another ending',
      });
    yield* stream;
  }
}

/** Reader by the file's ending; null for one that is no history. */
function readFileAs(path: string): LabelledStream | null {
  const name = basename(path).toLowerCase();
  const isPacked = name.endsWith('.gz');
  const plain = isPacked ? name.slice(0, -3) : name;
  if (plain.endsWith('.jsonl') || plain.endsWith('.ndjson'))
    return guardStream(path, isPacked, (chunks) => readJsonl(chunks, path));
  if (plain.endsWith('.csv')) return guardStream(path, isPacked, (chunks) => readCsv(chunks, path));
  if (plain.endsWith('.mbox')) {
    const label = basename(path).slice(0, isPacked ? -8 : -5);
    return guardStream(path, isPacked, (chunks) => readMbox(chunks, path, label));
  }
  return null;
}

/** Reads a file; an error of the disk or of the packing becomes one bad element and ends that file alone. */
async function* guardStream(
  path: string,
  isPacked: boolean,
  read: (chunks: AsyncIterable<Uint8Array>) => LabelledStream,
): LabelledStream {
  const file = createReadStream(path, { highWaterMark: 1 << 18 });
  let chunks: AsyncIterable<Uint8Array> = file;
  if (isPacked) {
    const unpacked = createGunzip();
    file.on('error', (error) => unpacked.destroy(error));
    chunks = file.pipe(unpacked);
  }
  let failure: unknown = null;
  // Errors of the source end the lines early here, so that what was read before them still counts.
  const guarded = (async function* () {
    try {
      yield* chunks;
    } catch (error) {
      failure = error;
    }
  })();
  try {
    yield* read(guarded);
    if (failure !== null)
      yield bad(
        'file-unreadable',
        path,
        isPacked ? 'a complete gzip file (RFC 1952)' : 'a readable file',
        String((failure as { code?: string }).code ?? 'a damaged one'),
      );
  } finally {
    file.destroy();
  }
}

async function* readFolder(root: string): LabelledStream {
  let isAnythingUsable = false;
  for (const name of await namesIn(root)) {
    const path = join(root, name);
    if ((await stat(path).catch(() => null))?.isDirectory()) {
      isAnythingUsable = true;
      yield* readQueueFolder(path, name, bounds.labelledFolderDepthMax);
    } else {
      const stream = readFileAs(path);
      if (stream === null) continue;
      isAnythingUsable = true;
      yield* stream;
    }
  }
  if (!isAnythingUsable)
    throw new TallypostError({
      code: 'history-unknown',
      place: root,
      expected: labelledForms,
      got: 'a folder with neither folders nor histories in it',
    });
}

/** Mail and form files below a queue's folder; a file without an ending is mail, as mail stores leave it. */
async function* readQueueFolder(folder: string, label: string, depthLeft: number): LabelledStream {
  let othersCount = 0;
  for (const name of await namesIn(folder)) {
    const path = join(folder, name);
    const found = await stat(path).catch(() => null);
    if (found === null) yield bad('file-unreadable', path, 'a readable file', 'none');
    else if (found.isDirectory()) {
      if (depthLeft > 1) yield* readQueueFolder(path, label, depthLeft - 1);
      else
        yield bad(
          'folder-too-deep',
          path,
          `at most ${bounds.labelledFolderDepthMax} folders deep`,
          'a deeper one',
        );
    } else if (/\.json$/i.test(name)) yield readFormFile(path, label, found.size);
    else if (/\.eml$/i.test(name) || !/\.[a-z]\w*$/i.test(name)) yield readMailFile(path, label, found.size);
    else othersCount += 1;
  }
  if (othersCount > 0)
    yield bad(
      'file-unknown',
      folder,
      'files .eml or .json',
      `${othersCount} files of other endings, left out`,
    );
}

async function readMailFile(path: string, label: string, bytes: number) {
  if (bytes > bounds.rawBytesMax)
    return bad('message-too-large', path, `at most ${bounds.rawBytesMax} bytes a message`, `${bytes} bytes`);
  const raw = await readFile(path).catch(() => null);
  if (raw === null) return bad('file-unreadable', path, 'a readable file', 'none');
  return { kind: 'item', label, atMs: null, place: path, content: { kind: 'mail', raw } } as const;
}

async function readFormFile(path: string, label: string, bytes: number) {
  if (bytes > bounds.rawBytesMax)
    return bad('message-too-large', path, `at most ${bounds.rawBytesMax} bytes a message`, `${bytes} bytes`);
  let value: unknown;
  try {
    value = JSON.parse((await readFile(path, 'utf8')).replace(/^\uFEFF/, ''));
  } catch {
    return bad('json-unreadable', path, 'a JSON object', 'text that is not JSON');
  }
  if (!isObject(value)) return bad('record-not-object', path, 'a JSON object', kindOf(value));
  const atMs = typeof value.at === 'string' ? Date.parse(value.at) : Number.NaN;
  const json = readFormRecord(value, path, Number.isNaN(atMs) ? null : atMs);
  if (!(json instanceof Uint8Array)) return json;
  const time = Number.isNaN(atMs) ? null : atMs;
  return { kind: 'item', label, atMs: time, place: path, content: { kind: 'form', json } } as const;
}

/** Names in code-unit order, hidden ones left out. */
async function namesIn(folder: string): Promise<string[]> {
  return (await readdir(folder)).filter((name) => !name.startsWith('.')).sort();
}
