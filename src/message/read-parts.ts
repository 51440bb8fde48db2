import { Buffer } from 'node:buffer';
import type { Transform } from 'node:stream';
import type { MimeNode, SplitterChunk } from '@zone-eu/mailsplit';
import { Splitter } from '@zone-eu/mailsplit';
import { bounds } from '../bounds.ts';
import type { DefectCode, Defects } from './defects.ts';
import { type Field, HeaderGate, strayLines } from './header-gate.ts';
import { LineEnds } from './line-ends.ts';
import { isMultipart, openPart, type Part } from './part.ts';
import { type Budget, keepBody, openBudget } from './part-budget.ts';

/** What the first stage keeps of a message: chosen header fields and a bounded tree with bounded text bodies. */
export interface ReadMail {
  readonly fields: readonly Field[];
  /** A multipart without parts keeps the text before its first boundary as its body. */
  readonly root: Part;
  /** Set when reading stopped before the end. */
  readonly stoppedBy: DefectCode | null;
}

export type RawMail = Uint8Array | AsyncIterable<Uint8Array>;

/** Reads raw mail in one pass with bounded memory and time. Never throws: what went wrong stands in `defects`.
 *  `nowMs` is only used for the deadline; without it there is none. */
export async function readParts(raw: RawMail, defects: Defects, nowMs?: () => number): Promise<ReadMail> {
  const reader = new MailReader(defects);
  const pieces = raw instanceof Uint8Array ? [raw] : raw;
  let workedMs = 0;
  let rawBytes = 0;
  try {
    for await (const chunk of pieces) {
      const bytes = Buffer.from(chunk.buffer, chunk.byteOffset, chunk.byteLength);
      for (let at = 0; at < bytes.length && !reader.isStopped; at += bounds.parsePieceBytes) {
        const piece = bytes.subarray(at, at + bounds.parsePieceBytes);
        rawBytes += piece.length;
        if (rawBytes > bounds.rawBytesMax) {
          reader.stop('raw-cut');
          break;
        }
        // Only our own work counts towards the deadline, not waiting for the source.
        const startMs = nowMs?.() ?? 0;
        const wait = reader.take(piece);
        if (wait !== null) await wait;
        workedMs += (nowMs?.() ?? 0) - startMs;
        if (workedMs > bounds.parseMsMax) reader.stop('time-cut');
      }
      if (reader.isStopped) break;
    }
  } catch {
    // The source failed midway (a broken connection): its own reader reports that; what came so far counts.
    reader.stop('source-failed');
  }
  if (rawBytes === 0) defects.add('message-empty', 'message');
  return reader.finish();
}

/** What the splitter has but does not declare. */
interface LineSplitter {
  readonly node: MimeNode & { readonly _headerlen: number; parseHeaders(): void };
  processLine(line: Buffer | false, isFinal: boolean, next: (error?: unknown) => void): void;
}

/** A splitter whose own failures come as its error event (it works from the event loop, where a throw ends the process),
 *  and which hands out the parts that a boundary ends inside their header as well. */
function openSplitter(): Transform {
  const splitter = new Splitter({
    maxHeadSize: bounds.partHeaderBytesMax,
    maxChildNodes: bounds.partsMax,
    defaultInlineEmbedded: true,
  }) as Transform & LineSplitter;
  const processLine = splitter.processLine.bind(splitter);
  splitter.processLine = (line, isFinal, next) => {
    const { node } = splitter;
    try {
      processLine(line, isFinal, next);
      if (splitter.node !== node && !node.headers && node._headerlen > 0) {
        node.parseHeaders();
        splitter.push(node);
      }
    } catch (error) {
      next(error instanceof Error ? error : new Error('line unreadable'));
    }
  };
  return splitter;
}

/** Feeds the header to the gate and, for a multipart, the rest to the splitter. */
class MailReader {
  readonly #defects: Defects;
  readonly #gate: HeaderGate;
  readonly #budget: Budget = openBudget();
  readonly #parts = new Map<MimeNode, Part>();
  #preambleBytes = 0;
  readonly #preambleIsCut = new Set<Part>();
  #partHeaderBytes = 0;
  #root: Part | null = null;
  #splitter: Transform | null = null;
  #stoppedBy: DefectCode | null = null;
  readonly #lineEnds = new LineEnds();

  constructor(defects: Defects) {
    this.#defects = defects;
    this.#gate = new HeaderGate(defects);
  }

  get isStopped(): boolean {
    return this.#stoppedBy !== null;
  }

  stop(code: DefectCode): void {
    if (this.#stoppedBy !== null) return;
    this.#stoppedBy = code;
    this.#defects.add(code, 'message');
  }

  /** Gives a promise only when the splitter needs the event loop; null when the piece was taken at once. */
  take(received: Buffer): Promise<void> | null {
    return this.#takeLines(this.#lineEnds.take(received));
  }

  #takeLines(piece: Buffer): Promise<void> | null {
    if (this.#gate.isDone) return this.#takeBody(piece);
    const body = this.#gate.feed(piece);
    if (body === null) return null;
    this.#openRoot();
    return this.#takeBody(body);
  }

  async finish(): Promise<ReadMail> {
    if (!this.isStopped) await this.#takeLines(this.#lineEnds.end());
    if (this.#lineEnds.isBareCr) this.#defects.add('line-ends-bare-cr', 'message');
    if (!this.#gate.isDone) {
      const body = this.#gate.end();
      this.#openRoot();
      if (!this.isStopped && body.length > 0) await this.#takeBody(body);
    }
    const splitter = this.#splitter;
    if (splitter !== null) {
      if (this.isStopped) splitter.destroy();
      else await new Promise<void>((done) => splitter.once('close', done).end());
    }
    for (const part of this.#preambleIsCut) {
      if (part.children.length === 0) this.#defects.add('text-cut', part.number);
    }
    return { fields: this.#gate.fields, root: this.#root!, stoppedBy: this.#stoppedBy };
  }

  #openRoot(): void {
    const field = (name: string) => this.#gate.fields.find((f) => f.name === name)?.value ?? '';
    this.#root = openPart('1', null, {
      contentType: field('content-type'),
      transferEncoding: field('content-transfer-encoding'),
      disposition: field('content-disposition'),
      subject: '',
    });
    const root = this.#root;
    if (!isMultipart(root) && root.contentType !== 'message/rfc822') return;
    const splitter = openSplitter();
    splitter.on('data', (chunk: SplitterChunk) => {
      // Thrown here, an error would reach the event loop and end the process.
      try {
        this.#takeChunk(chunk);
      } catch {
        this.stop('part-unreadable');
      }
    });
    splitter.on('error', (error: Error) => {
      this.stop(
        /header size/i.test(error.message)
          ? 'header-cut'
          : /child nodes/i.test(error.message)
            ? 'parts-cut'
            : 'part-unreadable',
      );
    });
    this.#splitter = splitter;
    const head = ['content-type', 'content-transfer-encoding', 'content-disposition']
      .map((name) => (field(name) === '' ? '' : `${name}: ${field(name)}\r\n`))
      .join('');
    splitter.write(Buffer.from(`${head}\r\n`, 'latin1'));
  }

  #takeBody(piece: Buffer): Promise<void> | null {
    if (piece.length === 0) return null;
    const splitter = this.#splitter;
    if (splitter === null) {
      keepBody(this.#root!, piece, this.#budget, this.#defects);
      return null;
    }
    // The callback comes once the piece is split; after an error it never does, but `close` does.
    return new Promise((done) => {
      splitter.once('close', done);
      splitter.write(piece, () => {
        splitter.off('close', done);
        done();
      });
    });
  }

  #takeChunk(chunk: SplitterChunk): void {
    if (this.isStopped) return;
    if (chunk.type === 'node') {
      this.#openNode(chunk);
      return;
    }
    const part = this.#parts.get(chunk.node);
    if (part === undefined || !chunk.value) return;
    if (chunk.type === 'body') keepBody(part, chunk.value, this.#budget, this.#defects);
    else if (isMultipart(part) && part.children.length === 0) this.#keepPreamble(part, chunk.value);
  }

  #openNode(node: MimeNode): void {
    if (this.#parts.size === 0) {
      this.#parts.set(node, this.#root!);
      return;
    }
    this.#partHeaderBytes += node.getHeaders().length;
    if (this.#partHeaderBytes > bounds.partHeadersBytesMax) {
      this.stop('header-cut');
      return;
    }
    const parent = (node.parentNode && this.#parts.get(node.parentNode)) || this.#root!;
    if (parent.depth + 1 > bounds.partDepthMax) {
      this.stop('depth-cut');
      return;
    }
    const headers = node.headers;
    const first = (name: string) => (headers ? headers.getFirst(name) : '');
    const part = openPart(`${parent.number}.${parent.children.length + 1}`, parent, {
      contentType: first('Content-Type'),
      transferEncoding: first('Content-Transfer-Encoding'),
      disposition: first('Content-Disposition'),
      subject:
        parent.contentType === 'message/rfc822' ? first('Subject').slice(0, bounds.subjectBytesMax) : '',
    });
    parent.children.push(part);
    this.#parts.set(node, part);
    const stray = strayLines(node.getHeaders());
    if (stray.length === 0) return;
    this.#defects.add('header-missing', part.number);
    // In front of base64 they would spoil what follows.
    if (part.transferEncoding !== 'base64') keepBody(part, stray, this.#budget, this.#defects);
  }

  #keepPreamble(part: Part, bytes: Buffer): void {
    const kept = bytes.subarray(0, Math.max(0, bounds.preambleBytesMax - this.#preambleBytes));
    if (kept.length > 0) part.pieces.push(Buffer.from(kept));
    this.#preambleBytes += kept.length;
    if (kept.length < bytes.length) this.#preambleIsCut.add(part);
  }
}
