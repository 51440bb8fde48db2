import { type Fault, TallypostError } from '../errors.ts';

/** One thing wrong with a desk's file: the member by JSON Pointer (RFC 6901), what it should be and what it is. */
export interface DeskProblem {
  readonly pointer: string;
  readonly expected: string;
  readonly got: string;
}

/** A desk's file that cannot be used, with everything that is wrong with it. */
export class DeskError extends TallypostError {
  readonly problems: readonly Fault[];

  constructor(place: string, problems: readonly DeskProblem[]) {
    const faults = problems.map(({ pointer, expected, got }) => ({
      code: 'desk-invalid',
      place: `${place}#${pointer}`,
      expected,
      got,
    }));
    const first = faults[0]!;
    if (faults.length === 1) super(first);
    else super({ code: 'desk-invalid', place, expected: 'a valid desk file', got: listed(problems) });
    this.problems = faults;
  }
}

function listed(problems: readonly DeskProblem[]): string {
  const lines = problems.map(
    ({ pointer, expected, got }) => `\n  ${pointer}: expected ${expected}, got ${got}`,
  );
  return `${problems.length} problems:${lines.join('')}`;
}

/** JSON Pointer (RFC 6901 section 3) of a path of member names and indices. */
export function pointerOf(path: readonly PropertyKey[]): string {
  return path.map((step) => `/${String(step).replaceAll('~', '~0').replaceAll('/', '~1')}`).join('');
}

/** A value as it is shown behind `got`: short, and never more than its beginning. */
export function shownValue(value: unknown): string {
  if (value === undefined) return 'nothing';
  if (Array.isArray(value)) return `a list of ${value.length}`;
  if (typeof value === 'object' && value !== null) return 'an object';
  const text = JSON.stringify(value);
  return text.length <= 60 ? text : `${text.slice(0, 59)}…`;
}
