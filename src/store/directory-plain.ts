import {
  type Dirent,
  mkdirSync,
  readdirSync,
  readFileSync,
  renameSync,
  statSync,
  utimesSync,
  writeFileSync,
} from 'node:fs';
import { dirname, join } from 'node:path';
import { isPlainName, plainPathOf } from './directory-names.ts';
import { isMissing, newId, removeFile } from './directory-versions.ts';

/** A file that lies in the store's directory under its own name. */
export interface PlainFile {
  readonly path: string;
  /** Inode, time and size: an edited or replaced file has another. */
  readonly identity: string;
  readonly bytes: number;
  readonly modifiedAtMs: number;
  /** Written by the store as a copy to look at, not by a person. */
  readonly isView: boolean;
}

/** Objects that people open get a plain copy of the current body under their own name. */
const viewedPrefixes = ['inbound/', 'config/', 'reports/'];

export const isViewed = (key: string): boolean => viewedPrefixes.some((prefix) => key.startsWith(prefix));

/** The plain file of a key; null when there is none or the key makes no file name. */
export function findPlain(directory: string, key: string): PlainFile | null {
  const relative = plainPathOf(key);
  if (relative === null) return null;
  const path = join(directory, relative);
  const stat = statSync(path, { throwIfNoEntry: false });
  if (stat === undefined || !stat.isFile()) return null;
  return {
    path,
    identity: `${stat.ino}-${stat.mtimeMs}-${stat.size}`,
    bytes: stat.size,
    modifiedAtMs: stat.mtimeMs,
    isView: carriesMark(key, stat.mtimeMs),
  };
}

/** The body of a plain file; null when it is gone by now. */
export function readPlain(plain: PlainFile): Buffer | null {
  try {
    return readFileSync(plain.path);
  } catch (error) {
    if (isMissing(error)) return null;
    throw error;
  }
}

/** The microseconds that mark a view: a function of its key and second, so that no file that a person writes, edits or
 *  copies carries them but by a chance of three in a million. Needs no extra file and survives a crash. */
function markOf(key: string, second: number): number {
  let hash = 0x811c9dc5; // FNV-1a, 32 bits
  for (const byte of Buffer.from(`${second}:${key}`)) hash = Math.imul(hash ^ byte, 0x01000193) >>> 0;
  return 1 + (hash % 999_998);
}

function carriesMark(key: string, modifiedAtMs: number): boolean {
  const second = Math.floor(modifiedAtMs / 1000);
  return Math.abs((modifiedAtMs - second * 1000) * 1000 - markOf(key, second)) < 1.5;
}

/** Puts a view of a body in its place. Only a copy to look at: it is not waited for, and where it cannot be made (a
 *  folder in its place, a full disk, times too coarse for the mark) there is none. */
export function writeView(
  directory: string,
  temporaries: string,
  key: string,
  body: Uint8Array,
  nowMs: number,
): void {
  const relative = plainPathOf(key);
  if (relative === null) return;
  const path = join(directory, relative);
  const temporary = join(temporaries, `view-${process.pid}-${newId()}`);
  try {
    writeFileSync(temporary, body, { flag: 'wx' });
    const second = Math.floor(nowMs / 1000);
    // Half a microsecond more, because the system cuts the fraction and a double is exact to a quarter only.
    const time = second + (markOf(key, second) + 0.5) / 1_000_000;
    utimesSync(temporary, time, time);
    if (!carriesMark(key, statSync(temporary).mtimeMs)) return;
    try {
      renameSync(temporary, path);
    } catch {
      mkdirSync(dirname(path), { recursive: true });
      renameSync(temporary, path);
    }
  } catch {
    // The object itself is safe.
  } finally {
    try {
      removeFile(temporary);
    } catch {
      // Swept later.
    }
  }
}

/** Keys of the plain files below a folder of the directory; `prefix` ends with `/` or is empty. */
export function* listPlain(directory: string, prefix: string): Iterable<string> {
  const relative = prefix === '' ? '' : plainPathOf(prefix.slice(0, -1));
  if (relative === null) return;
  let entries: Dirent[];
  try {
    entries = readdirSync(join(directory, relative), { withFileTypes: true });
  } catch {
    return; // No such folder.
  }
  for (const entry of entries) {
    if (!isPlainName(entry.name)) continue;
    const key = prefix + entry.name;
    // A linked file counts, a linked folder does not: it could lead round in circles.
    if (entry.isDirectory()) yield* listPlain(directory, `${key}/`);
    else if (entry.isFile() || entry.isSymbolicLink()) yield key;
  }
}
