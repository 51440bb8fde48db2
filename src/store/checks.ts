import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';

/** An HTTP token (RFC 9110 section 5.6.2) in lower case: user metadata travels as `x-amz-meta-` headers. */
const metadataKey = /^[!#$%&'*+.^_`|~0-9a-z-]+$/;
/** Printable ASCII without white space at either end, which HTTP would trim (RFC 9110 section 5.5). */
const metadataValue = /^(?:[!-~](?:[ -~]*[!-~])?)?$/;

/** Refuses a key that some store could not hold: empty, above 1,024 bytes of UTF-8, lone surrogates, control characters. */
export function checkKey(key: string): void {
  const bytes = Buffer.byteLength(key);
  if (bytes === 0 || bytes > bounds.keyBytesMax)
    throw badKey(key, `1 to ${bounds.keyBytesMax} bytes of UTF-8`, `${bytes} bytes`);
  // biome-ignore lint/suspicious/noControlCharactersInRegex: control characters are what is looked for
  if (/[\u0000-\u001f\u007f]/.test(key)) throw badKey(key, 'no control characters', 'a control character');
  if (/\p{Cs}/u.test(key)) throw badKey(key, 'well-formed Unicode', 'a lone surrogate');
  if (/(^|\/)\.\.?(\/|$)/.test(key)) throw badKey(key, 'no segment `.` or `..`', 'such a segment');
}

function badKey(key: string, expected: string, got: string): TallypostError {
  return new TallypostError({
    code: 'key-refused',
    place: JSON.stringify(key.slice(0, 80)),
    expected,
    got,
  });
}

/** Refuses metadata that S3 would refuse or give back changed: 2 KB, lower-case keys, printable ASCII. */
export function checkMetadata(key: string, metadata: Readonly<Record<string, string>>): void {
  let bytes = 0;
  for (const [name, value] of Object.entries(metadata)) {
    bytes += name.length + value.length;
    if (!metadataKey.test(name))
      throw badMetadata(key, 'a lower-case name', JSON.stringify(name.slice(0, 80)));
    if (!metadataValue.test(value))
      throw badMetadata(key, `printable ASCII without outer spaces in ${name}`, 'something else');
  }
  if (bytes > bounds.metadataBytesMax)
    throw badMetadata(key, `at most ${bounds.metadataBytesMax} bytes`, `${bytes} bytes`);
}

function badMetadata(key: string, expected: string, got: string): TallypostError {
  return new TallypostError({ code: 'metadata-refused', place: key, expected, got });
}

/** Refuses a body above what the caller can take, before it is read. */
export function checkSize(key: string, bytes: number, bytesMax: number | undefined): void {
  if (bytesMax !== undefined && bytes > bytesMax)
    throw new TallypostError({
      code: 'object-too-large',
      place: key,
      expected: `at most ${bytesMax} bytes`,
      got: `${bytes} bytes`,
    });
}

/** The content type of an object that was written without one. */
export function contentTypeOf(key: string): string {
  if (key.endsWith('.json')) return 'application/json';
  if (key.endsWith('.eml')) return 'message/rfc822';
  if (key.endsWith('.html')) return 'text/html; charset=utf-8';
  return 'application/octet-stream';
}

/** Order of UTF-8 bytes, as S3 lists; JavaScript's own order differs from U+D800 on. */
export function sortKeys(keys: string[]): string[] {
  keys.sort();
  if (keys.some((key) => /[\ud800-\uffff]/.test(key)))
    keys.sort((a, b) => Buffer.compare(Buffer.from(a), Buffer.from(b)));
  return keys;
}

export function isAfter(key: string, after: string): boolean {
  return Buffer.compare(Buffer.from(key), Buffer.from(after)) > 0;
}

/** A body in memory as chunks of bounded size. */
export async function* chunksOf(body: Uint8Array): AsyncIterable<Uint8Array> {
  for (let at = 0; at < body.length; at += bounds.streamChunkBytesMax)
    yield body.subarray(at, at + bounds.streamChunkBytesMax);
}
