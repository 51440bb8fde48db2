/** What went wrong, where, what was expected and what was there instead. Never carries a customer's text. */
export interface Fault {
  /** Stable, kebab-case; callers branch on it. */
  readonly code: string;
  /** Object key, file path with line, or a JSON Pointer into the desk's file. */
  readonly place: string;
  readonly expected: string;
  readonly got: string;
}

/** The one error of our own. Bad mail is data and never becomes one; a bad desk file, table or request does. */
export class TallypostError extends Error implements Fault {
  override readonly name = 'TallypostError';
  readonly code: string;
  readonly place: string;
  readonly expected: string;
  readonly got: string;

  constructor(fault: Fault, cause?: unknown) {
    super(
      `${fault.code} at ${fault.place}: expected ${fault.expected}, got ${fault.got}`,
      cause === undefined ? undefined : { cause },
    );
    this.code = fault.code;
    this.place = fault.place;
    this.expected = fault.expected;
    this.got = fault.got;
  }
}
