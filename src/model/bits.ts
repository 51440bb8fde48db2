import type { ByteReader, ByteWriter } from './bytes.ts';

/** Numbers of so many bits each, least bit first, without gaps; whole bytes again after `end`. */
export class BitWriter {
  readonly #out: ByteWriter;
  #held = 0;
  #length = 0;

  constructor(out: ByteWriter) {
    this.#out = out;
  }

  /** `value` below 2^bits, at most 2^53. */
  write(value: number, bits: number): void {
    let rest = value;
    let left = bits;
    for (; left > 16; left -= 16) {
      this.#put(rest % 0x10000, 16);
      rest = Math.floor(rest / 0x10000);
    }
    this.#put(rest, left);
  }

  end(): void {
    if (this.#length > 0) this.#out.byte(this.#held);
    this.#held = 0;
    this.#length = 0;
  }

  #put(value: number, bits: number): void {
    this.#held |= value << this.#length;
    this.#length += bits;
    for (; this.#length >= 8; this.#length -= 8) {
      this.#out.byte(this.#held & 0xff);
      this.#held >>>= 8;
    }
  }
}

/** Reads what BitWriter wrote. Throws TallypostError `bytes-broken` at the end of the bytes. */
export class BitReader {
  readonly #reader: ByteReader;
  #held = 0;
  #length = 0;

  constructor(reader: ByteReader) {
    this.#reader = reader;
  }

  read(bits: number): number {
    let value = 0;
    let scale = 1;
    let left = bits;
    for (; left > 16; left -= 16) {
      value += this.#get(16) * scale;
      scale *= 0x10000;
    }
    return value + this.#get(left) * scale;
  }

  #get(bits: number): number {
    for (; this.#length < bits; this.#length += 8) this.#held |= this.#reader.byte() << this.#length;
    const value = this.#held & ((1 << bits) - 1);
    this.#held >>>= bits;
    this.#length -= bits;
    return value;
  }
}
