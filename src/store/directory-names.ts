import { join } from 'node:path';
import { bounds } from '../bounds.ts';

/** Everything the store keeps for itself, below the store's directory. */
export const hiddenFolder = '.tallypost';

/** Ends the folder of an object's versions; `@` is escaped elsewhere, so that keys `a` and `a/b` can both exist. */
const objectMark = '@';
/** Ends a folder that continues in the next one without a `/`: a part of a name too long for one file name. */
const continuationMark = '&';
/** Stands for an empty segment, as in `a//b`; never part of another encoding, where two digits follow. */
const emptySegment = '%';

/** Lower-case letters and digits stay, all else is escaped byte by byte: capitals too, because some file systems
 *  take `A` and `a` for one name. A leading dot is escaped so that no folder is hidden or means the parent. */
function encodeSegment(segment: string): string {
  if (segment === '') return emptySegment;
  if (/^[a-z0-9_~+,=-][a-z0-9_.~+,=-]*$/.test(segment)) return segment;
  let out = '';
  for (const byte of Buffer.from(segment)) {
    const character = String.fromCharCode(byte);
    const isPlain = /[a-z0-9_.~+,=-]/.test(character) && !(out === '' && character === '.');
    out += isPlain ? character : `%${byte.toString(16).padStart(2, '0')}`;
  }
  return out;
}

function decode(encoded: string): string {
  const bytes: number[] = [];
  for (let at = 0; at < encoded.length; at += 1) {
    if (encoded[at] !== '%') bytes.push(encoded.charCodeAt(at));
    else if (/^[0-9a-f]{2}$/.test(encoded.slice(at + 1, at + 3))) {
      bytes.push(Number.parseInt(encoded.slice(at + 1, at + 3), 16));
      at += 2;
    }
  }
  return Buffer.from(bytes).toString('utf8');
}

/** The folder names of one segment: several when it is too long for one. */
function foldersOf(segment: string): string[] {
  const units = encodeSegment(segment).match(/%..|./g) as string[];
  const folders: string[] = [];
  for (let at = 0; at < units.length; at += bounds.nameUnitsMax)
    folders.push(units.slice(at, at + bounds.nameUnitsMax).join(''));
  return folders.map((folder, i) => (i < folders.length - 1 ? folder + continuationMark : folder));
}

/** The folder that holds an object's versions, relative to the folder of all versions. */
export function versionsFolderOf(key: string): string {
  return join(...key.split('/').flatMap(foldersOf)) + objectMark;
}

/** The folder below which every key with this prefix has its versions; '' for all. */
export function versionsFolderOfPrefix(prefix: string): string {
  const segments = prefix.split('/').slice(0, -1);
  return segments.length === 0 ? '' : join(...segments.flatMap(foldersOf));
}

/** What a folder name adds to an encoded key, and whether an object's versions are inside. */
export function readFolderName(name: string): { readonly encoded: string; readonly isObject: boolean } {
  if (name.endsWith(objectMark)) return { encoded: name.slice(0, -1), isObject: true };
  if (name.endsWith(continuationMark)) return { encoded: name.slice(0, -1), isObject: false };
  return { encoded: `${name}/`, isObject: false };
}

export const decodeKey = decode;
export const encodePrefix = (prefix: string): string =>
  prefix
    .split('/')
    .slice(0, -1)
    .map((segment) => `${encodeSegment(segment)}/`)
    .join('');

/** Where a person would put or look for this object, relative to the store's directory; null when its key makes no
 *  file name that every system takes. */
export function plainPathOf(key: string): string | null {
  const segments = key.split('/');
  return segments.every((segment) => isPlainName(segment)) ? join(...segments) : null;
}

/** Hidden files belong to editors and systems, `~` ends editors' copies, and the rest is not a name everywhere. */
export function isPlainName(name: string): boolean {
  return (
    name !== '' &&
    !name.startsWith('.') &&
    !/[\\:*?"<>|~]$|[\\:*?"<>|]/.test(name) &&
    Buffer.byteLength(name) <= 255
  );
}
