import type { Desk } from '../desk/desk.ts';
import type { World } from '../ledger/world.ts';
import type { Measurement } from '../metrics/measurement.ts';

/** One line of structured log. Ids, codes and numbers; never a customer's text. */
export interface LogLine {
  readonly level: 'info' | 'warn' | 'error';
  /** What happened, kebab-case. */
  readonly event: string;
  readonly [member: string]: unknown;
}

/** What every handler works with. */
export interface HandlerDeps {
  readonly world: World;
  /** The desk as its file now says; the same object as long as the file is unchanged. Rejects with a TallypostError. */
  readonly loadDesk: () => Promise<Desk>;
  /** 16 bytes under which tokens are hashed. */
  readonly tokenKey: Uint8Array;
  readonly log: (line: LogLine) => void;
  /** Takes what was measured, any number of times an invocation; left out: nobody looks. */
  readonly measure?: (measurements: readonly Measurement[]) => void;
  /** Messages left for a person are marked for the deployed page; left out: nobody looks there. */
  readonly isMarkingWaiting?: boolean;
  /** What stands before every key of this desk in a bucket's events, without the slash; empty or left out: nothing. */
  readonly prefix?: string;
}

/** The same deps, whose log lines are also kept, so that a batch is measured by what it says of itself. */
export function keepLines<D extends Pick<HandlerDeps, 'log'>>(
  deps: D,
): { readonly deps: D; readonly lines: readonly LogLine[] } {
  const lines: LogLine[] = [];
  const log = (line: LogLine) => {
    lines.push(line);
    deps.log(line);
  };
  return { deps: { ...deps, log }, lines };
}
