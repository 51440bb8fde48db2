import { TallypostError } from '../errors.ts';
import { tokenBits } from '../features/schema.ts';
import type { CountsView, EncodedRegion, RegionCounts } from './counts.ts';

/** A region's tokens in ascending order, one at a time: of the present one, cells stand at `from` to `to` of `column` (ascending)
 *  and `count`. Good until the next call of `next`. */
export interface Rows {
  readonly token: number;
  readonly from: number;
  readonly to: number;
  readonly column: Uint32Array;
  readonly count: Float64Array;
  /** Moves to the next token; false at the end. */
  next(): boolean;
}

/** Reads a region from its first token on. Throws TallypostError `bytes-broken` where bytes are no counts. */
export function rowsOf(region: RegionCounts | EncodedRegion): Rows {
  return 'bytes' in region ? new EncodedRows(region) : new RegionRows(region);
}

/** Distinct tokens of a region. */
export function rowCount(region: RegionCounts | EncodedRegion): number {
  return 'bytes' in region ? region.rows : region.tokens.length;
}

/** Counts of all regions that are not zero. */
export function cellCount({ regions }: Pick<CountsView, 'regions'>): number {
  return regions.reduce((sum, r) => sum + ('bytes' in r ? r.cells : r.column.length), 0);
}

class RegionRows implements Rows {
  token = -1;
  from = 0;
  to = 0;
  readonly column: Uint32Array;
  readonly count: Float64Array;
  readonly #region: RegionCounts;
  #row = 0;

  constructor(region: RegionCounts) {
    this.#region = region;
    this.column = region.column;
    this.count = region.count;
  }

  next(): boolean {
    const { tokens, start } = this.#region;
    if (this.#row === tokens.length) return false;
    this.token = tokens[this.#row];
    this.from = start[this.#row];
    this.to = start[++this.#row];
    return true;
  }
}

/** Two places of the same bytes: one walks over the tokens, one over the cells. */
class EncodedRows implements Rows {
  token = -1;
  readonly from = 0;
  to = 0;
  readonly column: Uint32Array;
  readonly count: Float64Array;
  readonly #region: EncodedRegion;
  readonly #bytes: Uint8Array;
  #row = 0;
  #cells = 0;
  #tokenAt: number;
  #at: number;
  #behind = 0;

  constructor(region: EncodedRegion) {
    this.#region = region;
    this.#bytes = region.bytes;
    this.#tokenAt = region.tokensAt;
    this.#at = region.cellsAt;
    this.column = new Uint32Array(region.columns);
    this.count = new Float64Array(region.columns);
  }

  next(): boolean {
    const { rows, cells, columns } = this.#region;
    if (this.#row === rows) {
      if (this.#cells !== cells) throw this.#broken(`${cells} cells`, String(this.#cells));
      return false;
    }
    this.#row++;
    const bytes = this.#bytes;
    const end = this.#region.endAt;
    this.token += this.#varint(this.#tokenAt) + 1;
    this.#tokenAt = this.#behind;
    if (this.token >= 2 ** tokenBits) throw this.#broken(`tokens below 2^${tokenBits}`, String(this.token));
    let at = this.#at;
    let column = 0;
    let n = 0;
    // Nearly all numbers are of one byte: these are read here, without a call.
    for (;;) {
      if (at >= end) throw this.#broken('more bytes', 'the end');
      let code = bytes[at++];
      if (code >= 0x80) {
        code = this.#varint(at - 1);
        at = this.#behind;
      }
      column += code < 0x80 ? code >> 2 : Math.floor(code / 4);
      if (column >= columns) throw this.#broken(`a column below ${columns}`, String(column));
      this.column[n] = column++;
      let count = 1;
      if ((code & 1) !== 0) {
        if (at >= end) throw this.#broken('more bytes', 'the end');
        count = bytes[at++];
        if (count >= 0x80) {
          count = this.#varint(at - 1);
          at = this.#behind;
        }
        count += 2;
      }
      this.count[n++] = count;
      if ((code & 2) !== 0) break;
    }
    this.#at = at;
    this.to = n;
    this.#cells += n;
    return true;
  }

  /** The number at a place; what follows it is `#behind`. */
  #varint(start: number): number {
    const bytes = this.#bytes;
    const end = this.#region.endAt;
    let at = start;
    let value = 0;
    let scale = 1;
    for (;;) {
      if (at >= end) throw this.#broken('more bytes', 'the end');
      const byte = bytes[at++];
      value += (byte & 0x7f) * scale;
      if (byte < 0x80) break;
      scale *= 0x80;
      if (value > Number.MAX_SAFE_INTEGER) throw this.#broken('a whole number below 2^53', 'a larger one');
    }
    this.#behind = at;
    return value;
  }

  #broken(expected: string, got: string): TallypostError {
    const place = `${this.#region.place}, byte ${this.#at}`;
    return new TallypostError({ code: 'bytes-broken', place, expected, got });
  }
}
