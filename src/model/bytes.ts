import { crc32 } from 'node:zlib';
import { TallypostError } from '../errors.ts';

/** Grows as it is written to. Integers are unsigned LEB128: seven bits a byte, least first, top bit set on all but the last. */
export class ByteWriter {
  #bytes: Uint8Array;
  #length = 0;

  /** `capacity` bytes are set aside; the system gives room only to those that are written. */
  constructor(capacity = 1024) {
    this.#bytes = new Uint8Array(capacity);
  }

  get length(): number {
    return this.#length;
  }

  /** Starts anew in the same room. */
  clear(): void {
    this.#length = 0;
  }

  byte(value: number): void {
    if (this.#length === this.#bytes.length) this.#grow(1);
    this.#bytes[this.#length++] = value;
  }

  /** A whole number from 0 to 2^53 - 1. */
  varint(value: number): void {
    let rest = value;
    while (rest >= 0x80) {
      this.byte((rest % 0x80) | 0x80);
      rest = Math.floor(rest / 0x80);
    }
    this.byte(rest);
  }

  float64(value: number): void {
    const bytes = new Uint8Array(8);
    new DataView(bytes.buffer).setFloat64(0, value, true);
    this.raw(bytes);
  }

  text(value: string): void {
    const bytes = new TextEncoder().encode(value);
    this.varint(bytes.length);
    this.raw(bytes);
  }

  raw(bytes: Uint8Array): void {
    if (this.#length + bytes.length > this.#bytes.length) this.#grow(bytes.length);
    this.#bytes.set(bytes, this.#length);
    this.#length += bytes.length;
  }

  /** What was written so far; a view that the next write may leave behind. */
  written(): Uint8Array {
    return this.#bytes.subarray(0, this.#length);
  }

  #grow(more: number): void {
    const bytes = new Uint8Array(Math.max(this.#bytes.length * 2, this.#length + more));
    bytes.set(this.#bytes.subarray(0, this.#length));
    this.#bytes = bytes;
  }
}

/** Reads what ByteWriter wrote. Never reads past the end: throws TallypostError `bytes-truncated`. */
export class ByteReader {
  readonly #bytes: Uint8Array;
  readonly #place: string;
  #at = 0;

  constructor(bytes: Uint8Array, place: string) {
    this.#bytes = bytes;
    this.#place = place;
  }

  byte(): number {
    if (this.#at >= this.#bytes.length)
      throw this.broken('more bytes', `the end after ${this.#bytes.length}`);
    return this.#bytes[this.#at++];
  }

  varint(): number {
    let byte = this.byte();
    if (byte < 0x80) return byte;
    let value = byte & 0x7f;
    // Bit operations hold for four bytes; a 40-bit hash's distance seldom needs more.
    for (let shift = 7; shift < 28; shift += 7) {
      byte = this.byte();
      value |= (byte & 0x7f) << shift;
      if (byte < 0x80) return value;
    }
    let scale = 2 ** 28;
    do {
      byte = this.byte();
      value += (byte & 0x7f) * scale;
      scale *= 0x80;
      if (value > Number.MAX_SAFE_INTEGER) throw this.broken('a whole number below 2^53', 'a larger one');
    } while (byte >= 0x80);
    return value;
  }

  /** A varint that says how many items follow, each of at least one byte: a damaged one is refused, not allocated. */
  length(max: number = this.#bytes.length - this.#at): number {
    const length = this.varint();
    if (length > max) throw this.broken(`a length of at most ${max}`, String(length));
    return length;
  }

  float64(): number {
    const { buffer, byteOffset } = this.raw(8);
    return new DataView(buffer, byteOffset, 8).getFloat64(0, true);
  }

  text(): string {
    return new TextDecoder().decode(this.raw(this.length()));
  }

  raw(length: number): Uint8Array {
    if (this.#at + length > this.#bytes.length) throw this.broken(`${length} more bytes`, 'the end');
    this.#at += length;
    return this.#bytes.subarray(this.#at - length, this.#at);
  }

  /** Where it stands. */
  get at(): number {
    return this.#at;
  }

  moveTo(at: number): void {
    this.#at = at;
  }

  /** Nothing may be left over. */
  end(): void {
    if (this.#at !== this.#bytes.length)
      throw this.broken('the end', `${this.#bytes.length - this.#at} more bytes`);
  }

  broken(expected: string, got: string): TallypostError {
    return new TallypostError({
      code: 'bytes-broken',
      place: `${this.#place}, byte ${this.#at}`,
      expected,
      got,
    });
  }
}

/** What sealed bytes hold: each kind's number, and the version of the layout in which it is written; older ones are read. */
const kinds = {
  counts: { number: 1, layout: 1 },
  table: { number: 2, layout: 2 },
  entries: { number: 3, layout: 1 },
  features: { number: 4, layout: 1 },
} as const;
export type SealedKind = keyof typeof kinds;
const magic = [0x54, 0x50]; // "TP"
const headBytes = 16;
const tailBytes = 4;

/** Wraps a payload so that damage is seen before anything is read from it:
 *
 *      "TP" | kind | layout version | payload length, 4 bytes LE | schema id, 8 bytes | payload | CRC-32 of all before, LE
 *
 *  CRC-32 (IEEE 802.3) finds every burst of up to 32 bits, and other damage but for one case in 2^32. It guards against
 *  accidents; whoever may write to the store may also write a valid table. */
export function seal(kind: SealedKind, schemaId: string, payload: Uint8Array): Uint8Array {
  const out = new ByteWriter(headBytes + payload.length + tailBytes);
  out.raw(new Uint8Array(headBytes));
  out.raw(payload);
  return sealWritten(kind, schemaId, out);
}

/** A writer whose payload is sealed where it stands, without a copy: see `sealWritten`. */
export function createSealedWriter(capacity: number): ByteWriter {
  const out = new ByteWriter(headBytes + capacity + tailBytes);
  out.raw(new Uint8Array(headBytes));
  return out;
}

/** Seals what was written behind the head of a `createSealedWriter`. */
export function sealWritten(kind: SealedKind, schemaId: string, out: ByteWriter): Uint8Array {
  const payloadBytes = out.length - headBytes;
  out.raw(new Uint8Array(tailBytes));
  const sealed = out.written();
  const view = new DataView(sealed.buffer, sealed.byteOffset, sealed.byteLength);
  sealed.set([...magic, kinds[kind].number, kinds[kind].layout]);
  view.setUint32(4, payloadBytes, true);
  sealed.set(Buffer.from(schemaId, 'hex'), 8);
  view.setUint32(sealed.length - tailBytes, crc32(sealed.subarray(0, -tailBytes)), true);
  return sealed;
}

/** The payload of sealed bytes, which it views.
 *  Throws TallypostError: `format-unknown` (not ours, or of another kind or layout), `bytes-truncated`, `bytes-altered`,
 *  `schema-mismatch` when a schema id is given and differs. */
export function unseal(
  kind: SealedKind,
  sealed: Uint8Array,
  schemaId: string | null,
  place: string,
): Uint8Array {
  const refuse = (code: string, expected: string, got: string) =>
    new TallypostError({ code, place, expected, got });
  if (sealed.length < headBytes + tailBytes) {
    throw refuse('bytes-truncated', `at least ${headBytes + tailBytes} bytes`, String(sealed.length));
  }
  const view = new DataView(sealed.buffer, sealed.byteOffset, sealed.byteLength);
  const head = sealed.subarray(0, 4);
  const { number, layout } = kinds[kind];
  const isOurs = head[0] === magic[0] && head[1] === magic[1] && head[2] === number;
  if (!isOurs || head[3] < 1 || head[3] > layout) {
    throw refuse(
      'format-unknown',
      layout === 1 ? `${kind} in layout 1` : `${kind} in layout 1 to ${layout}`,
      `a file that starts with ${Buffer.from(head).toString('hex')}`,
    );
  }
  const expectedBytes = headBytes + view.getUint32(4, true) + tailBytes;
  if (sealed.length !== expectedBytes) {
    const code = sealed.length < expectedBytes ? 'bytes-truncated' : 'bytes-altered';
    throw refuse(code, `${expectedBytes} bytes`, String(sealed.length));
  }
  const sum = crc32(sealed.subarray(0, -tailBytes));
  const written = view.getUint32(sealed.length - tailBytes, true);
  if (sum !== written) throw refuse('bytes-altered', `check sum ${written.toString(16)}`, sum.toString(16));
  const id = Buffer.from(sealed.subarray(8, headBytes)).toString('hex');
  if (schemaId !== null && id !== schemaId)
    throw refuse('schema-mismatch', `schema ${schemaId}`, `schema ${id}`);
  return sealed.subarray(headBytes, -tailBytes);
}

/** The version of the layout of sealed bytes. */
export function layoutOf(sealed: Uint8Array): number {
  return sealed[3];
}
