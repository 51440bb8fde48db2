import { Buffer } from 'node:buffer';

const lf = 0x0a;
const cr = 0x0d;
/** A run of CR at the end of a piece waits for what follows it, up to this length. */
const heldBytesMax = 1024;

/** Makes the line ends of a message readable for what splits it at LF. Mail whose first line ends in a bare CR, as
 *  old programs wrote it, gets LF for every CR; all other mail passes as it is. The same for every way in which the
 *  bytes are cut into pieces. */
export class LineEnds {
  #kind: 'unknown' | 'lf' | 'cr' = 'unknown';
  #held: Buffer = Buffer.alloc(0);
  #isFirst = true;

  get isBareCr(): boolean {
    return this.#kind === 'cr';
  }

  take(received: Buffer): Buffer {
    if (this.#kind === 'lf') return received;
    let piece = this.#held.length === 0 ? received : Buffer.concat([this.#held, received]);
    this.#held = Buffer.alloc(0);
    if (this.#isFirst) {
      // A byte order mark may come in pieces as well.
      if (piece.length < 3 && piece[0] === 0xef) return this.#hold(piece);
      this.#isFirst = false;
      if (piece[0] === 0xef && piece[1] === 0xbb && piece[2] === 0xbf) piece = piece.subarray(3);
    }
    if (this.#kind === 'unknown') this.#kind = kindOf(piece);
    if (this.#kind === 'lf') return piece;
    let end = piece.length;
    while (end > 0 && piece[end - 1] === cr) end--;
    if (piece.length - end > heldBytesMax) {
      this.#kind = 'cr';
      end = piece.length;
    }
    this.#held = piece.subarray(end);
    return this.#convert(piece.subarray(0, end));
  }

  /** What was still held when the message ended. */
  end(): Buffer {
    return this.#convert(this.#held);
  }

  #hold(piece: Buffer): Buffer {
    this.#held = piece;
    return Buffer.alloc(0);
  }

  #convert(bytes: Buffer): Buffer {
    if (this.#kind !== 'cr') return bytes;
    return Buffer.from(bytes.toString('latin1').replace(/\r+\n|\r/g, '\n'), 'latin1');
  }
}

/** By the first line end: LF, or CR once or more before LF (some relays double it), or CR alone. */
function kindOf(piece: Buffer): 'unknown' | 'lf' | 'cr' {
  const firstLf = piece.indexOf(lf);
  const firstCr = piece.indexOf(cr);
  if (firstCr < 0 || (firstLf >= 0 && firstLf < firstCr)) return firstLf < 0 ? 'unknown' : 'lf';
  let next = firstCr;
  while (piece[next] === cr) next++;
  if (next === piece.length) return 'unknown';
  return piece[next] === lf ? 'lf' : 'cr';
}
