/** A run of text and whether the mail client marked it as not this writer's own. */
export interface Segment {
  readonly text: string;
  readonly isQuoted: boolean;
}

/** Joins pieces of text as a browser lays them out: white space folds into one space, blocks break lines. */
export class SegmentWriter {
  readonly #segments: Segment[] = [];
  #out: string[] = [];
  #isQuoted = false;
  #breaks = 0;
  #hasSpace = false;

  write(text: string, isQuoted: boolean, isPreformatted: boolean): void {
    if (isQuoted !== this.#isQuoted) {
      // White space alone does not change sides.
      if (text.trim() === '') {
        this.#hasSpace = true;
        return;
      }
      this.#endSegment();
      this.#isQuoted = isQuoted;
    }
    if (isPreformatted) {
      this.#emit(text);
      return;
    }
    const core = text.trim();
    if (core === '') {
      this.#hasSpace ||= text !== '';
      return;
    }
    if (isSpace(text.charCodeAt(0))) this.#hasSpace = true;
    this.#emit(core.replace(/[ \t\r\n\f]+/g, ' '));
    if (isSpace(text.charCodeAt(text.length - 1))) this.#hasSpace = true;
  }

  /** At least this many line breaks before the next text; `<br>` adds one to those that stand. */
  breakLine(count: 1 | 2): void {
    this.#breaks = Math.max(this.#breaks, count);
  }

  addBreak(): void {
    this.#breaks = Math.min(2, this.#breaks + 1);
  }

  space(): void {
    this.#hasSpace = true;
  }

  take(): readonly Segment[] {
    this.#endSegment();
    return this.#segments;
  }

  #emit(text: string): void {
    if (this.#out.length > 0) {
      if (this.#breaks > 0) this.#out.push('\n'.repeat(this.#breaks));
      else if (this.#hasSpace) this.#out.push(' ');
    }
    this.#breaks = 0;
    this.#hasSpace = false;
    this.#out.push(text);
  }

  #endSegment(): void {
    if (this.#out.length > 0) this.#segments.push({ text: this.#out.join(''), isQuoted: this.#isQuoted });
    this.#out = [];
  }
}

/** What String.trim takes away, as far as HTML text holds it at its ends. */
function isSpace(unit: number): boolean {
  return unit <= 0x20 || unit === 0xa0 || (unit > 0x7f && String.fromCharCode(unit).trim() === '');
}
