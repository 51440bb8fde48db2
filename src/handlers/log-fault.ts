import { DeskError } from '../desk/desk-problem.ts';
import { TallypostError } from '../errors.ts';
import type { LogLine } from './handler-deps.ts';

/** An error as it may be logged. Our own errors carry no customer's text; of any other the message may, so that only its
 *  name and the frames of its stack are shown. */
export function faultMembers(error: unknown): Omit<LogLine, 'level' | 'event'> {
  if (error instanceof DeskError) return { code: error.code, place: error.place, problems: error.problems };
  if (error instanceof TallypostError) {
    const { code, place, expected, got } = error;
    return {
      code,
      place,
      expected,
      got,
      ...(error.cause === undefined ? {} : { cause: nameOf(error.cause) }),
    };
  }
  return { code: 'unexpected', error: nameOf(error), frames: framesOf(error) };
}

/** What stands behind the message in the stack: a message may have lines that look like frames. */
function framesOf(error: unknown): string[] {
  if (!(error instanceof Error)) return [];
  const { stack = '', message } = error;
  const at = stack.indexOf(message);
  const lines = at === -1 ? [] : stack.slice(at + message.length).split('\n');
  const frames = lines.filter((line) => /^\s+at /.test(line));
  return frames.slice(0, 8).map((line) => line.trim());
}

function nameOf(error: unknown): string {
  if (!(error instanceof Error)) return typeof error;
  const code = (error as { code?: unknown }).code;
  return typeof code === 'string' ? `${error.name} ${code}` : error.name;
}
