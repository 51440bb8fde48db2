/** One line of a stream of bytes, without its line end. */
export interface Line {
  /** From 1. */
  readonly number: number;
  /** Null when the line was longer than allowed; what it held is gone. */
  readonly bytes: Buffer | null;
}

const newLine = 0x0a;
const carriageReturn = 0x0d;

/** Lines of a stream, cut at \n or \r\n. Linear in the input; holds one line of at most `lineBytesMax` at a time. */
export async function* readLines(
  chunks: AsyncIterable<Uint8Array>,
  lineBytesMax: number,
): AsyncGenerator<Line> {
  let pieces: Buffer[] = [];
  let held = 0;
  let isTooLong = false;
  let number = 1;
  const add = (piece: Buffer) => {
    held += piece.length;
    if (held > lineBytesMax) {
      isTooLong = true;
      pieces = [];
    } else if (piece.length > 0) pieces.push(piece);
  };
  const take = (): Line => {
    let bytes: Buffer | null = null;
    if (!isTooLong) {
      bytes = pieces.length === 1 ? pieces[0]! : Buffer.concat(pieces);
      if (bytes.length > 0 && bytes[bytes.length - 1] === carriageReturn) bytes = bytes.subarray(0, -1);
    }
    const line = { number, bytes };
    number += 1;
    pieces = [];
    held = 0;
    isTooLong = false;
    return line;
  };
  for await (const chunk of chunks) {
    const buffer = Buffer.from(chunk.buffer, chunk.byteOffset, chunk.byteLength);
    let from = 0;
    for (let at = buffer.indexOf(newLine); at >= 0; at = buffer.indexOf(newLine, from)) {
      add(buffer.subarray(from, at));
      yield take();
      from = at + 1;
    }
    if (from < buffer.length) add(buffer.subarray(from));
  }
  if (held > 0) yield take();
}
