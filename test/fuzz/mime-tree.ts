import { Buffer } from 'node:buffer';
import fc from 'fast-check';
import iconv from 'iconv-lite';

/** A MIME tree with known texts. */
export type Tree = TextLeaf | Alternative | Attachment | Branch | Embedded;

export interface TextLeaf {
  readonly kind: 'plain' | 'html';
  readonly charset: string;
  readonly encoding: '8bit' | 'quoted-printable' | 'base64';
  /** Stems; each gets a number of its own when the tree is written, so that every word is found or missed by itself. */
  readonly stems: readonly string[];
  readonly header: HeaderStyle;
}

export interface Alternative {
  readonly kind: 'alternative';
  readonly leaf: TextLeaf;
  /** The HTML inside multipart/related with a picture. */
  readonly isRelated: boolean;
}

export interface Attachment {
  readonly kind: 'attachment';
  readonly type: string;
  readonly bytes: Uint8Array;
  readonly disposition: boolean;
}

export interface Branch {
  readonly kind: 'branch';
  readonly type: 'mixed' | 'related' | 'parallel' | 'signed';
  readonly children: readonly Tree[];
  readonly preamble: boolean;
  readonly epilogue: boolean;
  readonly isQuotedBoundary: boolean;
}

export interface Embedded {
  readonly kind: 'embedded';
  readonly child: Tree;
}

export interface HeaderStyle {
  readonly isUpperCase: boolean;
  readonly isFolded: boolean;
  readonly hasComment: boolean;
  readonly extraField: boolean;
}

/** Where a text stands in the written mail: the part's header and body, without its boundary lines. */
export interface Placed {
  readonly words: readonly string[];
  readonly start: number;
  readonly end: number;
}

export interface Written {
  readonly raw: Buffer;
  readonly texts: readonly Placed[];
  readonly attachments: number;
  /** Words that stand in attachments, which must not be found in the text. */
  readonly attachedWords: readonly string[];
}

const stemsByCharset: Readonly<Record<string, readonly string[]>> = {
  'utf-8': ['water', 'Zähler', 'счёт', '水表', 'λογαριασμός', 'मीटर', 'قراءة', 'reading=', '€uro', 'a.b'],
  'us-ascii': ['water', 'bill', 'meter=', '.dot', 'From'],
  'iso-8859-1': ['Zähler', 'été', 'año', 'water'],
  'windows-1252': ['€uro', 'Zähler', 'œuvre'],
  'iso-8859-2': ['błąd', 'żółw', 'water'],
  'koi8-r': ['счёт', 'вода', 'water'],
  'windows-1251': ['счёт', 'вода'],
  'windows-1253': ['νερό', 'water'],
  'windows-1255': ['מים', 'water'],
  gb18030: ['水表', '账单', 'water'],
  shift_jis: ['水道', 'メーター'],
  'euc-kr': ['계량기', 'water'],
  'utf-16le': ['water', '水表', 'Zähler'],
};

const headerStyle: fc.Arbitrary<HeaderStyle> = fc.record({
  isUpperCase: fc.boolean(),
  isFolded: fc.boolean(),
  hasComment: fc.boolean(),
  extraField: fc.boolean(),
});

const textLeaf: fc.Arbitrary<TextLeaf> = fc.constantFrom(...Object.keys(stemsByCharset)).chain((charset) =>
  fc.record({
    kind: fc.constantFrom('plain' as const, 'plain' as const, 'html' as const),
    charset: fc.constant(charset),
    // UTF-16 holds bytes that no line may hold, so it is always encoded.
    encoding:
      charset === 'utf-16le'
        ? fc.constant('base64' as const)
        : fc.constantFrom('8bit' as const, 'quoted-printable' as const, 'base64' as const),
    stems: fc.array(fc.constantFrom(...stemsByCharset[charset]!), { minLength: 1, maxLength: 12 }),
    header: headerStyle,
  }),
);

const attachment: fc.Arbitrary<Attachment> = fc.record({
  kind: fc.constant('attachment' as const),
  type: fc.constantFrom(
    'application/pdf',
    'image/jpeg',
    'application/octet-stream',
    'text/csv',
    'audio/ogg',
    'text/plain',
  ),
  bytes: fc.uint8Array({ maxLength: 200 }),
  disposition: fc.boolean(),
});

export const tree: fc.Arbitrary<Tree> = fc.letrec<{ tree: Tree; branch: Branch }>((tie) => ({
  tree: fc.oneof(
    { depthSize: 'small', maxDepth: 4 },
    { weight: 4, arbitrary: textLeaf },
    {
      weight: 2,
      arbitrary: fc.record({
        kind: fc.constant('alternative' as const),
        leaf: textLeaf,
        isRelated: fc.boolean(),
      }),
    },
    { weight: 1, arbitrary: attachment },
    { weight: 3, arbitrary: tie('branch') },
    { weight: 1, arbitrary: fc.record({ kind: fc.constant('embedded' as const), child: tie('tree') }) },
  ),
  branch: fc.record({
    kind: fc.constant('branch' as const),
    type: fc.constantFrom('mixed' as const, 'related' as const, 'parallel' as const, 'signed' as const),
    children: fc.array(tie('tree'), { minLength: 1, maxLength: 4 }),
    preamble: fc.boolean(),
    epilogue: fc.boolean(),
    isQuotedBoundary: fc.boolean(),
  }),
})).tree;

/** Writes a tree as mail with the given line end. */
export function writeMail(root: Tree, lineEnd: '\r\n' | '\n'): Written {
  const writer = new TreeWriter(lineEnd);
  writer.line('From: Anna Berg <anna@berg.example>');
  writer.line('To: help@fenmarkwater.example');
  writer.line('Subject: Question');
  writer.line('MIME-Version: 1.0');
  writer.write(root);
  return writer.take();
}

class TreeWriter {
  readonly #lineEnd: string;
  readonly #parts: Buffer[] = [];
  readonly #texts: Placed[] = [];
  readonly #attachedWords: string[] = [];
  #length = 0;
  #attachments = 0;
  #count = 0;

  constructor(lineEnd: string) {
    this.#lineEnd = lineEnd;
  }

  line(text: string): void {
    this.#bytes(Buffer.from(text + this.#lineEnd, 'latin1'));
  }

  take(): Written {
    return {
      raw: Buffer.concat(this.#parts),
      texts: this.#texts,
      attachments: this.#attachments,
      attachedWords: this.#attachedWords,
    };
  }

  write(node: Tree): void {
    switch (node.kind) {
      case 'plain':
      case 'html': {
        const start = this.#length;
        const words = this.#number(node.stems);
        this.#leaf(node, words);
        this.#texts.push({ words, start, end: this.#length });
        break;
      }
      case 'alternative':
        this.#alternative(node);
        break;
      case 'attachment':
        this.#attachment(node);
        break;
      case 'branch': {
        const boundary = this.#openMultipart(node.type, node.isQuotedBoundary);
        if (node.preamble) this.line('A preamble that nobody should see.');
        for (const child of node.children) {
          this.line(`--${boundary}`);
          this.write(child);
          this.line('');
        }
        this.line(`--${boundary}--`);
        if (node.epilogue) this.line('An epilogue that nobody should see.');
        break;
      }
      case 'embedded':
        this.line('Content-Type: message/rfc822');
        this.line('');
        this.line('From: someone@else.example');
        this.#attachments++;
        this.write(node.child);
        break;
    }
  }

  #bytes(bytes: Buffer): void {
    this.#parts.push(bytes);
    this.#length += bytes.length;
  }

  #number(stems: readonly string[]): string[] {
    return stems.map((stem) => `${stem}n${this.#count++}n`);
  }

  #openMultipart(type: string, isQuoted: boolean): string {
    const boundary = `=_b${this.#count++}_x`;
    this.line(
      `Content-Type: multipart/${type}; boundary=${isQuoted ? `"${boundary}"` : boundary.replace('=', '')}`,
    );
    this.line('');
    return isQuoted ? boundary : boundary.replace('=', '');
  }

  #alternative({ leaf, isRelated }: Alternative): void {
    const start = this.#length;
    const words = this.#number(leaf.stems);
    const boundary = this.#openMultipart('alternative', true);
    this.line(`--${boundary}`);
    this.#leaf({ ...leaf, kind: 'plain' }, words);
    this.line('');
    this.line(`--${boundary}`);
    if (isRelated) {
      const inner = this.#openMultipart('related', true);
      this.line(`--${inner}`);
      this.#leaf({ ...leaf, kind: 'html' }, words);
      this.line('');
      this.line(`--${inner}`);
      this.line('Content-Type: image/png');
      this.line('Content-Transfer-Encoding: base64');
      this.line('');
      this.line('iVBORw0KGgo=');
      this.line(`--${inner}--`);
      this.#attachments++;
    } else this.#leaf({ ...leaf, kind: 'html' }, words);
    this.line('');
    this.line(`--${boundary}--`);
    this.#texts.push({ words, start, end: this.#length });
  }

  #attachment({ type, bytes, disposition }: Attachment): void {
    const isText = type === 'text/plain';
    const words = isText ? this.#number(['attached']) : [];
    this.#attachedWords.push(...words);
    this.line(`Content-Type: ${type}; name="file.bin"`);
    // Text without disposition would be text of the message.
    if (disposition || isText) this.line('Content-Disposition: attachment; filename="file.bin"');
    this.line('Content-Transfer-Encoding: base64');
    this.line('');
    this.line(Buffer.from(isText ? words.join(' ') : bytes).toString('base64'));
    this.#attachments++;
  }

  #leaf({ kind, charset, encoding, header }: TextLeaf, words: readonly string[]): void {
    const name = (text: string) => (header.isUpperCase ? text.toUpperCase() : text);
    if (header.extraField) this.line('X-Extra: something');
    const fold = header.isFolded ? `${this.#lineEnd} ` : ' ';
    const comment = header.hasComment ? ' (a comment)' : '';
    this.line(`${name('Content-Type')}: text/${kind};${fold}charset="${charset}"${comment}`);
    this.line(`${name('Content-Transfer-Encoding')}: ${name(encoding)}`);
    this.line('');
    const text = kind === 'html' ? toHtml(words) : toLines(words, this.#lineEnd);
    const bytes = iconv.encode(text, charset);
    if (encoding === '8bit') this.#bytes(bytes);
    else if (encoding === 'base64')
      this.#bytes(Buffer.from(wrap(bytes.toString('base64'), this.#lineEnd), 'latin1'));
    else this.#bytes(Buffer.from(quotePrintable(bytes, this.#lineEnd), 'latin1'));
    this.line('');
  }
}

/** Three words a line. */
function toLines(words: readonly string[], lineEnd: string): string {
  const lines: string[] = [];
  for (let i = 0; i < words.length; i += 3) lines.push(words.slice(i, i + 3).join(' '));
  return lines.join(lineEnd);
}

function toHtml(words: readonly string[]): string {
  const body = words
    .map((word, i) => (i % 3 === 0 ? `<p>${word}</p>` : `<span title="no">${word}</span>`))
    .join(' ');
  return `<html><head><title>no</title></head><body>${body}<!-- no --></body></html>`;
}

function wrap(text: string, lineEnd: string): string {
  return text.replace(/(.{76})/g, `$1${lineEnd}`);
}

/** RFC 2045 section 6.7: all but printable ASCII escaped, lines of at most 76 characters. */
export function quotePrintable(bytes: Uint8Array, lineEnd: string): string {
  let line = '';
  const lines: string[] = [];
  for (let i = 0; i < bytes.length; i++) {
    const byte = bytes[i]!;
    if (byte === 0x0d && bytes[i + 1] === 0x0a) continue;
    if (byte === 0x0a) {
      lines.push(line.replace(/ $/, '=20'));
      line = '';
      continue;
    }
    const isPlain = byte >= 0x20 && byte <= 0x7e && byte !== 0x3d;
    const piece = isPlain
      ? String.fromCharCode(byte)
      : `=${byte.toString(16).toUpperCase().padStart(2, '0')}`;
    if (line.length + piece.length > 75) {
      lines.push(`${line}=`);
      line = '';
    }
    line += piece;
  }
  lines.push(line.replace(/ $/, '=20'));
  return lines.join(lineEnd);
}
