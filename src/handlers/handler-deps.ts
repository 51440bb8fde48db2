import type { Desk } from '../desk/desk.ts';
import type { World } from '../ledger/world.ts';

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
  /** What stands before every key of this desk in a bucket's events, without the slash; empty or left out: nothing. */
  readonly prefix?: string;
}
