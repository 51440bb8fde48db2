import { randomBytes } from 'node:crypto';
import {
  closeSync,
  fstatSync,
  fsync,
  linkSync,
  mkdirSync,
  openSync,
  readdirSync,
  readSync,
  rmdirSync,
  unlinkSync,
  writeSync,
} from 'node:fs';
import { dirname, join } from 'node:path';
import { promisify } from 'node:util';
import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';

/** First line of a version file, JSON; the body follows it. An empty file is a deletion as well: only deletions
 *  are written without waiting for the disk. */
export interface Header {
  /** Never used twice; with the number it makes the ETag. */
  readonly id: string;
  /** Ids of the versions before this one, the nearest first. */
  readonly lineage: readonly string[];
  readonly isDeleted: boolean;
  readonly contentType: string;
  readonly metadata: Readonly<Record<string, string>>;
  /** Which plain file this version took the place of, or null. */
  readonly plain: string | null;
  readonly bodyBytes: number;
}

export interface Version {
  readonly number: number;
  /** Numbers below it that a writer has not removed, or not yet. */
  readonly older: readonly number[];
  readonly header: Header;
  readonly modifiedAtMs: number;
}

/** An open version: its body can be read although the file is unlinked meanwhile. */
export interface OpenVersion extends Version {
  readonly descriptor: number;
  readonly bodyStart: number;
}

const headBytes = 8192;
const syncFile = promisify(fsync);

export function isMissing(error: unknown): boolean {
  const code = (error as NodeJS.ErrnoException).code;
  return code === 'ENOENT' || code === 'ENOTDIR';
}

/** Numbers of the version files in a folder, ascending; empty when there is no folder. */
export function numbersIn(folder: string): number[] {
  try {
    return readdirSync(folder)
      .filter((name) => /^[0-9]+$/.test(name))
      .map(Number)
      .sort((a, b) => a - b);
  } catch (error) {
    if (isMissing(error)) return [];
    throw error;
  }
}

/** Opens the newest version, which the caller closes; null when there is none.
 *  The newest file of a folder is never removed while it stands for an object, so that a file that vanished between
 *  the two calls has a successor: look again. */
export function openNewest(folder: string): OpenVersion | null {
  for (let attempt = 0; attempt < bounds.directoryAttemptsMax; attempt += 1) {
    const older = numbersIn(folder);
    const number = older.pop();
    if (number === undefined) return null;
    try {
      const descriptor = openSync(join(folder, String(number)), 'r');
      try {
        return { number, older, descriptor, ...readHeader(descriptor, join(folder, String(number))) };
      } catch (error) {
        closeSync(descriptor);
        throw error;
      }
    } catch (error) {
      if (!isMissing(error)) throw error;
    }
  }
  throw new TallypostError({
    code: 'store-busy',
    place: folder,
    expected: 'a version that stays',
    got: 'other writers',
  });
}

export function readNewest(folder: string): Version | null {
  const version = openNewest(folder);
  if (version !== null) closeSync(version.descriptor);
  return version;
}

function readHeader(descriptor: number, place: string): Omit<OpenVersion, 'number' | 'older' | 'descriptor'> {
  const stat = fstatSync(descriptor);
  const deleted: Header = {
    id: 'deleted',
    lineage: [],
    isDeleted: true,
    contentType: '',
    metadata: {},
    plain: null,
    bodyBytes: 0,
  };
  if (stat.size === 0) return { header: deleted, bodyStart: 0, modifiedAtMs: stat.mtimeMs };
  const head = Buffer.allocUnsafe(Math.min(headBytes, stat.size));
  readFully(descriptor, head, 0);
  const end = head.indexOf(0x0a);
  try {
    const header = JSON.parse(head.toString('utf8', 0, end)) as Header;
    if (end > 0 && header.bodyBytes === stat.size - end - 1)
      return { header, bodyStart: end + 1, modifiedAtMs: stat.mtimeMs };
  } catch {
    // Falls through: a damaged header is reported the same way as a body of another length.
  }
  throw new TallypostError({
    code: 'object-damaged',
    place,
    expected: 'a header line and a body of the length it names',
    got: `${stat.size} bytes without`,
  });
}

/** Fills the buffer from a position of the file. */
function readFully(descriptor: number, into: Buffer, position: number): void {
  let done = 0;
  while (done < into.length) {
    const got = readSync(descriptor, into, done, into.length - done, position + done);
    if (got === 0) throw new Error('the file ended early');
    done += got;
  }
}

export function readBody(version: OpenVersion): Buffer {
  const body = Buffer.allocUnsafeSlow(version.header.bodyBytes);
  readFully(version.descriptor, body, version.bodyStart);
  return body;
}

/** The body in chunks; closes the version at the end or when the reader stops. */
export async function* streamBody(version: OpenVersion): AsyncIterable<Uint8Array> {
  try {
    const end = version.bodyStart + version.header.bodyBytes;
    for (let at = version.bodyStart; at < end; at += bounds.streamChunkBytesMax) {
      const chunk = Buffer.allocUnsafeSlow(Math.min(bounds.streamChunkBytesMax, end - at));
      readFully(version.descriptor, chunk, at);
      yield chunk;
    }
  } finally {
    closeSync(version.descriptor);
  }
}

export const newId = (): string => randomBytes(8).toString('hex');

/** Writes bytes to a new temporary file and waits for the disk when asked. Nothing is left behind by a failure. */
export async function writeTemporary(
  folder: string,
  parts: readonly Uint8Array[],
  mustSync: boolean,
): Promise<string> {
  const path = join(folder, `${process.pid}-${newId()}`);
  const descriptor = openSync(path, 'wx', 0o644);
  let isWritten = false;
  try {
    for (const part of parts) {
      let done = 0;
      while (done < part.length) done += writeSync(descriptor, part, done);
    }
    if (mustSync) await syncFile(descriptor);
    isWritten = true;
  } finally {
    closeSync(descriptor);
    if (!isWritten) removeFile(path);
  }
  return path;
}

/** Adds a version after `before`. This is the compare-and-set: link(2) gives the name of the next number to one writer.
 *
 *    readers take the highest number   ...  n        n+1            n+2
 *    writer A      reads n ................ links n+1 (A's)          checks: the highest is mine, or names mine
 *    writer B      reads n ................ n+1 exists: lost
 *    writer C      reads n+1 ........................ links n+2, removes n+1
 *    writer D      read n long ago ............................ links n+1 again! checks: n+2 does not name mine: lost
 *
 *  D's file lies below the highest number, which is never removed, so no reader ever saw it.
 *  Returns false when the race was lost. */
export async function addVersion(
  folder: string,
  temporaries: string,
  before: Version | null,
  header: Omit<Header, 'lineage' | 'bodyBytes'>,
  body: Uint8Array,
  /** Runs right before the link; false gives up. */
  stillHolds: () => boolean,
): Promise<boolean> {
  const lineage =
    before === null ? [] : [before.header.id, ...before.header.lineage].slice(0, bounds.lineageMax);
  const line = Buffer.from(
    `${JSON.stringify({ ...header, lineage, bodyBytes: body.length } satisfies Header)}\n`,
  );
  const temporary = await writeTemporary(temporaries, [line, body], !header.isDeleted);
  const number = (before?.number ?? 0) + 1;
  try {
    if (!stillHolds() || !linkOnce(temporary, join(folder, String(number)))) return false;
  } finally {
    removeFile(temporary);
  }
  const numbers = numbersIn(folder);
  if (numbers.at(-1) !== number) {
    const newest = readNewest(folder)?.header;
    if (newest !== undefined && newest.id !== header.id && !newest.lineage.includes(header.id)) {
      removeFile(join(folder, String(number)));
      return false;
    }
  }
  for (const old of numbers) if (old < number) removeFile(join(folder, String(old)));
  return true;
}

/** Gives a file its final name unless that is taken; makes the folders when they are not there. */
function linkOnce(from: string, to: string): boolean {
  for (let attempt = 0; attempt < bounds.directoryAttemptsMax; attempt += 1) {
    try {
      linkSync(from, to);
      return true;
    } catch (error) {
      if ((error as NodeJS.ErrnoException).code === 'EEXIST') return false;
      if (!isMissing(error) || attempt === bounds.directoryAttemptsMax - 1) throw error;
      // Either the first version of this key, or a sweep removed the empty folder just now.
      mkdirSync(dirname(to), { recursive: true });
    }
  }
  return false;
}

/** Removes a file; nothing to remove is fine. */
export function removeFile(path: string): void {
  try {
    unlinkSync(path);
  } catch (error) {
    if (!isMissing(error)) throw error;
  }
}

/** Removes what crashed writers left below the newest version, and a deletion that is old enough together with its
 *  folder when nothing else came. */
export function sweep(folder: string, newest: Version, nowMs: number): void {
  const ageMs = nowMs - newest.modifiedAtMs;
  if (ageMs >= bounds.temporaryAgeMsMax)
    for (const number of newest.older) removeFile(join(folder, String(number)));
  if (!newest.header.isDeleted || ageMs < bounds.tombstoneAgeMsMax) return;
  removeFile(join(folder, String(newest.number)));
  try {
    rmdirSync(folder);
  } catch {
    // Written again meanwhile, or swept by another process: both leave a right state.
  }
}
