import progress from 'cli-progress';
import type { Terminal } from './terminal.ts';

/** How far a command is. Writes on stderr, and only where a person is watching. */
export interface Progress {
  /** `done` of `total`; 0 for a total that is not known yet. */
  show(done: number, total: number, what: string): void;
  end(): void;
}

export function createProgress(terminal: Terminal, isJson: boolean): Progress {
  if (!terminal.isWatched || isJson) return { show: () => {}, end: () => {} };
  const bar = new progress.SingleBar({
    format: '{bar} {percentage} %  {what}',
    barsize: 30,
    barCompleteChar: '=',
    barIncompleteChar: '.',
    hideCursor: true,
    clearOnComplete: true,
    fps: 8,
    stream: process.stderr,
  });
  let isStarted = false;
  return {
    show(done, total, what) {
      if (!isStarted) bar.start(Math.max(total, 1), done, { what });
      else {
        bar.setTotal(Math.max(total, 1));
        bar.update(Math.min(done, Math.max(total, 1)), { what });
      }
      isStarted = true;
    },
    end() {
      if (isStarted) bar.stop();
    },
  };
}
