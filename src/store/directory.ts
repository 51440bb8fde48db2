import { closeSync, mkdirSync, readdirSync, statSync } from 'node:fs';
import { join } from 'node:path';
import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import { checkKey, checkMetadata, checkSize, chunksOf, contentTypeOf, isAfter, sortKeys } from './checks.ts';
import { guarded } from './directory-faults.ts';
import {
  decodeKey,
  encodePrefix,
  hiddenFolder,
  readFolderName,
  versionsFolderOf,
  versionsFolderOfPrefix,
} from './directory-names.ts';
import { findPlain, isViewed, listPlain, type PlainFile, readPlain, writeView } from './directory-plain.ts';
import {
  addVersion,
  isMissing,
  newId,
  type OpenVersion,
  openNewest,
  readBody,
  removeFile,
  streamBody,
  sweep,
  type Version,
} from './directory-versions.ts';
import type { ObjectHead, PutOptions, PutResult, Store } from './store.ts';

/** What a key holds now: its newest version, or a plain file that a person put there, or nothing. */
interface Current {
  readonly version: Version | null;
  readonly plain: PlainFile | null;
  /** The plain file is the object. */
  readonly isPlain: boolean;
  readonly head: ObjectHead | null;
}

interface Change {
  readonly body: Uint8Array;
  readonly contentType: string;
  readonly metadata: Readonly<Record<string, string>>;
  readonly isSameBody: boolean;
}

/** A store in a directory, safe between processes and against crashes; made when it is not there.
 *  Every object is a folder of numbered, immutable version files below `.tallypost/versions`, of which one remains;
 *  DEVELOPERS.md, "Stores", says why no write is lost. A plain file below the directory, put there by a person, is an
 *  object too.
 *  Throws TallypostError `store-full`, `store-refused`, `store-unsupported`, `store-failed`, `object-damaged`. */
export function createDirectoryStore(directory: string): Store {
  const versions = join(directory, hiddenFolder, 'versions');
  const temporaries = join(directory, hiddenFolder, 'temporary');
  let isReady = false;

  function makeReady(): void {
    if (isReady) return;
    mkdirSync(versions, { recursive: true });
    mkdirSync(temporaries, { recursive: true });
    for (const name of readdirSync(temporaries)) {
      const path = join(temporaries, name);
      const modifiedAtMs = statSync(path, { throwIfNoEntry: false })?.mtimeMs;
      if (modifiedAtMs !== undefined && Date.now() - modifiedAtMs > bounds.temporaryAgeMsMax)
        removeFile(path);
    }
    isReady = true;
  }

  const folderOf = (key: string): string => join(versions, versionsFolderOf(key));

  function headOfVersion(key: string, version: Version): ObjectHead {
    const { header } = version;
    return {
      key,
      etag: `${version.number}-${header.id}`,
      bytes: header.bodyBytes,
      modifiedAtMs: version.modifiedAtMs,
      contentType: header.contentType,
      metadata: header.metadata,
    };
  }

  function headOfPlain(key: string, plain: PlainFile): ObjectHead {
    return {
      key,
      etag: `0-${plain.identity}`,
      bytes: plain.bytes,
      modifiedAtMs: plain.modifiedAtMs,
      contentType: contentTypeOf(key),
      metadata: {},
    };
  }

  /** Whether a plain file is a person's word on this key, newer than the newest version. */
  function isPersons(key: string, plain: PlainFile, version: OpenVersion | null): boolean {
    if (version === null) return true;
    if (plain.isView || plain.identity === version.header.plain) return false;
    if (version.header.isDeleted) return true;
    // Settings are edited in place. Elsewhere a second copy of a message must not undo its routing. The same bytes with
    // other times are no edit: a directory copied back from a backup.
    if (!key.startsWith('config/')) return false;
    const words = readPlain(plain);
    return words !== null && !words.equals(readBody(version));
  }

  function examine<T>(key: string, use: (current: Current, open: OpenVersion | null) => T): T {
    const open = openNewest(folderOf(key));
    try {
      // Only these cases need the plain file: reading the model costs no extra look.
      const mayBePlain = open === null || open.header.isDeleted || key.startsWith('config/');
      const plain = mayBePlain ? findPlain(directory, key) : null;
      const isPlain = plain !== null && isPersons(key, plain, open);
      const isLive = open !== null && !open.header.isDeleted;
      const head = isPlain ? headOfPlain(key, plain) : isLive ? headOfVersion(key, open) : null;
      return use({ version: open, plain, isPlain, head }, open);
    } finally {
      if (open !== null) closeSync(open.descriptor);
    }
  }

  const look = (key: string): Current => examine(key, (current) => current);

  /** Body of what `examine` found; null when a plain file changed while it was read. */
  function bodyOf(key: string, current: Current, open: OpenVersion | null): Buffer | null {
    if (!current.isPlain) return readBody(open as OpenVersion);
    const body = readPlain(current.plain as PlainFile);
    return findPlain(directory, key)?.identity === current.plain?.identity ? body : null;
  }

  /** Puts a version after `current`; false when the race was lost. A null change deletes. */
  async function advance(key: string, current: Current, change: Change | null): Promise<string | null> {
    const id = newId();
    const plain = findPlain(directory, key);
    const header = {
      id,
      isDeleted: change === null,
      contentType: change?.contentType ?? '',
      metadata: change?.metadata ?? {},
      plain: plain?.identity ?? null,
    };
    const stillHolds = (): boolean =>
      !current.isPlain || findPlain(directory, key)?.identity === current.plain?.identity;
    const body = change?.body ?? new Uint8Array(0);
    if (!(await addVersion(folderOf(key), temporaries, current.version, header, body, stillHolds)))
      return null;
    if (change === null) removePlain(key, plain?.identity ?? null);
    // The plain file already shows the body when only the metadata changed.
    else if (isViewed(key) && !(change.isSameBody && plain !== null)) showPlain(key, id, body);
    return `${(current.version?.number ?? 0) + 1}-${id}`;
  }

  /** A view of the body just written; a view that came late is put right by whoever wrote it. */
  function showPlain(key: string, id: string, body: Uint8Array): void {
    writeView(directory, temporaries, key, body, Date.now());
    examine(key, (current, open) => {
      if (open === null || open.header.id === id || current.isPlain) return;
      if (open.header.isDeleted) removePlain(key, open.header.plain);
      else writeView(directory, temporaries, key, readBody(open), Date.now());
    });
  }

  /** Removes the store's own view, or the very file that was deleted. */
  function removePlain(key: string, identity: string | null): void {
    const plain = findPlain(directory, key);
    if (plain !== null && (plain.isView || plain.identity === identity)) removeFile(plain.path);
  }

  /** Keys with versions below a folder, in no order. */
  function* listVersions(folder: string, encoded: string): Iterable<string> {
    let names: string[];
    try {
      names = readdirSync(folder);
    } catch (error) {
      if (isMissing(error)) return; // Never there, or swept just now.
      throw error;
    }
    for (const name of names) {
      const part = readFolderName(name);
      if (part.isObject) yield decodeKey(encoded + part.encoded);
      else yield* listVersions(join(folder, name), encoded + part.encoded);
    }
  }

  const attempts = Array.from({ length: bounds.directoryAttemptsMax }, (_, i) => i);
  const busy = (key: string): TallypostError =>
    new TallypostError({
      code: 'store-busy',
      place: key,
      expected: 'a moment without other writers',
      got: 'none',
    });

  return {
    place: directory,

    async get(key, options = {}) {
      checkKey(key);
      return guarded(key, () => {
        for (const _ of attempts) {
          const result = examine(key, (current, open) => {
            const head = current.head;
            if (head === null) return { kind: 'missing' } as const;
            if (options.ifNoneMatch === head.etag) return { kind: 'not-modified' } as const;
            checkSize(key, head.bytes, options.bytesMax);
            const body = bodyOf(key, current, open);
            return body === null ? null : ({ kind: 'found', object: { ...head, body } } as const);
          });
          if (result !== null) return result;
        }
        throw busy(key);
      });
    },

    async stream(key) {
      checkKey(key);
      return guarded(key, () => {
        for (const _ of attempts) {
          const plainBody = examine(
            key,
            (current, open) => current.isPlain && { head: current.head, body: bodyOf(key, current, open) },
          );
          if (plainBody !== false) {
            if (plainBody.head !== null && plainBody.body !== null)
              return { head: plainBody.head, chunks: chunksOf(plainBody.body) };
            continue;
          }
          const version = openNewest(folderOf(key));
          if (version === null) return null;
          if (!version.header.isDeleted)
            return { head: headOfVersion(key, version), chunks: streamBody(version) };
          closeSync(version.descriptor);
          return null;
        }
        throw busy(key);
      });
    },

    async head(key) {
      checkKey(key);
      return guarded(key, () => look(key).head);
    },

    async put(key: string, body: Uint8Array, options: PutOptions = {}): Promise<PutResult> {
      checkKey(key);
      checkMetadata(key, options.metadata ?? {});
      const change = {
        body,
        contentType: options.contentType ?? contentTypeOf(key),
        metadata: { ...options.metadata },
        isSameBody: false,
      };
      const isConditional = options.ifMatch !== undefined || options.ifNoneMatch !== undefined;
      return guarded(key, async () => {
        makeReady();
        for (const _ of attempts) {
          const current = look(key);
          if (options.ifNoneMatch === '*' && current.head !== null) return { kind: 'lost' };
          if (options.ifMatch !== undefined && current.head?.etag !== options.ifMatch)
            return { kind: 'lost' };
          const etag = await advance(key, current, change);
          if (etag !== null) return { kind: 'written', etag };
          if (isConditional) return { kind: 'lost' };
        }
        throw busy(key);
      });
    },

    async *list(prefix, options = {}) {
      const after = options.after;
      const keys = guarded(prefix, () => {
        const folder = join(versions, versionsFolderOfPrefix(prefix));
        const found = new Set(listVersions(folder, encodePrefix(prefix)));
        for (const key of listPlain(directory, prefix.slice(0, prefix.lastIndexOf('/') + 1))) found.add(key);
        return sortKeys(
          [...found].filter((key) => key.startsWith(prefix) && (after === undefined || isAfter(key, after))),
        );
      });
      for (const key of keys) {
        const head = guarded(key, () => {
          const current = look(key);
          const version = current.version;
          if (version?.header.isDeleted && current.head === null) removePlain(key, version.header.plain);
          if (version !== null) sweep(folderOf(key), version, Date.now());
          return current.head;
        });
        if (head !== null) yield { key, etag: head.etag, bytes: head.bytes, modifiedAtMs: head.modifiedAtMs };
      }
    },

    async delete(key, options = {}) {
      checkKey(key);
      return guarded(key, async () => {
        for (const _ of attempts) {
          const current = look(key);
          // Looked at again in each attempt: whoever won the last one may have replaced it.
          if (options.ifMatch !== undefined && current.head !== null && current.head.etag !== options.ifMatch)
            return;
          if (current.head === null) return removePlain(key, current.version?.header.plain ?? null);
          makeReady();
          if ((await advance(key, current, null)) !== null) return;
        }
        throw busy(key);
      });
    },

    async replaceMetadata(key, metadata, options) {
      checkKey(key);
      checkMetadata(key, metadata);
      return guarded(key, async () => {
        makeReady();
        const found = examine(key, (current, open) => {
          if (current.head === null) return 'missing' as const;
          if (current.head.etag !== options.ifMatch) return 'lost' as const;
          const body = bodyOf(key, current, open);
          return body === null ? ('lost' as const) : { current, body, contentType: current.head.contentType };
        });
        if (typeof found === 'string') return { kind: found };
        const { current, body, contentType } = found;
        const change = { body, contentType, metadata: { ...metadata }, isSameBody: true };
        const etag = await advance(key, current, change);
        return etag === null ? { kind: 'lost' } : { kind: 'written', etag };
      });
    },
  };
}
