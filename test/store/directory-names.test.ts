import { sep } from 'node:path';
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { checkKey } from '../../src/store/checks.ts';
import {
  decodeKey,
  encodePrefix,
  plainPathOf,
  readFolderName,
  versionsFolderOf,
  versionsFolderOfPrefix,
} from '../../src/store/directory-names.ts';

/** Every key that the check lets pass, with the characters that matter to the encoding made likely. */
const anyKey = fc
  .array(
    fc.oneof(fc.constantFrom(...'/@&%.~ \\:AaÄ\u{1f600}'), fc.string({ unit: 'grapheme', maxLength: 60 })),
    { minLength: 1, maxLength: 20 },
  )
  .map((parts) => parts.join(''))
  .filter((key) => {
    try {
      checkKey(key);
      return true;
    } catch {
      return false;
    }
  });

/** The key that a walk down these folders finds. */
function walk(path: string): string {
  let encoded = '';
  for (const name of path.split(sep)) encoded += readFolderName(name).encoded;
  return decodeKey(encoded);
}

describe('the folder of an object', () => {
  it.each([
    ['model/manifest.json', 'model/manifest.json@'],
    ['inbound/Aé', 'inbound/%41%c3%a9@'],
    ['a@b&c', 'a%40b%26c@'],
    ['a//b/', 'a/%/b/%@'],
    ['.x/y.z', '%2ex/y.z@'],
    [`a${'b'.repeat(100)}`, `a${'b'.repeat(79)}&/${'b'.repeat(21)}@`],
  ])('of %j is %j', (key, folder) => {
    expect(versionsFolderOf(key).split(sep).join('/')).toBe(folder);
  });

  it('leads back to the key, for any key', () => {
    fc.assert(fc.property(anyKey, (key) => walk(versionsFolderOf(key)) === key));
  });

  it('differs between keys even where capitals do not count, and fits into file names', () => {
    fc.assert(
      fc.property(anyKey, anyKey, (a, b) => {
        const [folderA, folderB] = [versionsFolderOf(a), versionsFolderOf(b)];
        if (a !== b) expect(folderA.toLowerCase()).not.toBe(folderB.toLowerCase());
        for (const name of folderA.split(sep)) {
          expect(name.length).toBeLessThanOrEqual(255);
          expect(name).toMatch(/^[a-z0-9_%~+,=-][a-z0-9_.%~+,=@&-]*$/);
        }
      }),
    );
  });

  it('lies below the folder of each of its prefixes', () => {
    fc.assert(
      fc.property(anyKey, fc.nat(1024), (key, at) => {
        const prefix = key.slice(0, at);
        const above = versionsFolderOfPrefix(prefix);
        expect(above === '' || versionsFolderOf(key).startsWith(above + sep)).toBe(true);
        expect(decodeKey(encodePrefix(prefix))).toBe(prefix.slice(0, prefix.lastIndexOf('/') + 1));
      }),
    );
  });
});

describe('the plain file of an object', () => {
  it.each([
    ['inbound/a b.eml', 'inbound/a b.eml'],
    ['inbound/é/ü', 'inbound/é/ü'],
    ['inbound/.hidden', null],
    ['inbound//a', null],
    ['inbound/a:b', null],
    ['inbound/a~', null],
    ['.tallypost/versions', null],
    [`inbound/${'é'.repeat(128)}`, null],
  ])('of %j is %j', (key, path) => {
    expect(plainPathOf(key)?.split(sep).join('/') ?? null).toBe(path);
  });
});
