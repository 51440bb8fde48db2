import picocolors from 'picocolors';
import { TallypostError } from '../errors.ts';

/** What every command ends with; documented in the README. */
export const exitCodes = {
  /** All that was asked was done. */
  done: 0,
  /** The work was carried out and something in it failed, differs or was refused. */
  failed: 1,
  /** Nothing was done: wrong usage, or something given cannot be used (a path, a desk file, a damaged table). */
  unusable: 2,
} as const;

/** Where a command writes. */
export interface Terminal {
  readonly out: (text: string) => void;
  readonly err: (text: string) => void;
  /** A person is watching: progress may be drawn on stderr. */
  readonly isWatched: boolean;
  readonly colours: ReturnType<typeof picocolors.createColors>;
}

export function processTerminal(): Terminal {
  return {
    out: (text) => void process.stdout.write(text),
    err: (text) => void process.stderr.write(text),
    isWatched: process.stderr.isTTY === true,
    colours: picocolors.createColors(process.stdout.isTTY === true && picocolors.isColorSupported),
  };
}

/** What a command has to say, for programs and for people. */
export interface Answer {
  readonly json: unknown;
  readonly text: string;
  readonly exitCode?: number;
}

/** Carries a command's work out and writes its answer or its error; gives the exit code. */
export async function answer(
  terminal: Terminal,
  isJson: boolean,
  work: () => Promise<Answer>,
): Promise<number> {
  try {
    const { json, text, exitCode = exitCodes.done } = await work();
    terminal.out(isJson ? `${JSON.stringify(json, null, 2)}\n` : `${text.trimEnd()}\n`);
    return exitCode;
  } catch (error) {
    return writeError(terminal, isJson, error);
  }
}

/** Errors say what, where, expected and got. */
export function writeError(terminal: Terminal, isJson: boolean, error: unknown): number {
  const isOurs = error instanceof TallypostError;
  const fault = isOurs
    ? { code: error.code, place: error.place, expected: error.expected, got: error.got }
    : { code: 'unforeseen', place: 'tallypost', expected: 'no such error', got: describe(error) };
  if (isJson) terminal.out(`${JSON.stringify({ error: fault }, null, 2)}\n`);
  else {
    const { bold, red } = terminal.colours;
    terminal.err(`${red(bold(fault.code))} at ${fault.place}\n`);
    terminal.err(`  expected  ${fault.expected}\n  got       ${fault.got}\n`);
    if (!isOurs && process.env.TALLYPOST_TRACE !== undefined) terminal.err(`${(error as Error)?.stack}\n`);
  }
  return isOurs ? exitCodes.unusable : exitCodes.failed;
}

function describe(error: unknown): string {
  if (!(error instanceof Error)) return String(error);
  const code = (error as { code?: unknown }).code;
  return typeof code === 'string' ? `${code}: ${error.message}` : `${error.name}: ${error.message}`;
}
