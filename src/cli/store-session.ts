import { randomBytes } from 'node:crypto';
import { stat } from 'node:fs/promises';
import type { Command } from 'commander';
import type { Desk } from '../desk/desk.ts';
import { TallypostError } from '../errors.ts';
import { createExtractor, type Extractor } from '../features/extractor.ts';
import type { HandlerDeps, LogLine } from '../handlers/handler-deps.ts';
import { createDeskLoader } from '../handlers/load-desk.ts';
import { loadTokenKey } from '../handlers/load-token-key.ts';
import type { World } from '../ledger/world.ts';
import { keys } from '../store/keys.ts';
import { openStore } from '../store/open-store.ts';
import type { Store } from '../store/store.ts';

/** What commands that work on a store have in common. */
export interface StoreFlags {
  readonly store: string;
  readonly json?: boolean;
  readonly dryRun?: boolean;
}

export function withStore(command: Command): Command {
  return command
    .requiredOption('--store <place>', 'directory, or s3://bucket/prefix')
    .option('--json', 'answer in JSON');
}

export function withDryRun(command: Command): Command {
  return command.option('--dry-run', 'say what would be done, change nothing');
}

/** A store with its desk, opened. */
export interface StoreSession {
  readonly world: World;
  readonly desk: Desk;
  readonly extractor: Extractor;
  readonly deps: HandlerDeps;
}

/** The real clock, real randomness. */
export function worldOf(store: Store): World {
  return {
    store,
    nowMs: Date.now,
    random: Math.random,
    sleep: (ms) => new Promise((resolve) => setTimeout(resolve, ms)),
  };
}

/** Opens a store that is there already.
 *  @throws TallypostError store-missing, desk-missing, token-key-missing and what reading them throws. */
export async function openSession(
  place: string,
  log: (line: LogLine) => void = () => {},
): Promise<StoreSession> {
  await checkDirectory(place);
  const world = worldOf(await openStore(place));
  const loadDesk = createDeskLoader(world);
  const desk = await loadDesk();
  const tokenKey = await loadTokenKey(world.store, process.env.TALLYPOST_TOKEN_KEY, () => randomBytes(16));
  return {
    world,
    desk,
    extractor: createExtractor(desk, tokenKey),
    deps: { world, loadDesk, tokenKey, log },
  };
}

/** A mistyped directory must not become a new, empty store. */
async function checkDirectory(place: string): Promise<void> {
  if (/^[a-z0-9]+:\/\//i.test(place)) return;
  const found = await stat(place).catch(() => null);
  if (found?.isDirectory()) return;
  throw new TallypostError({
    code: 'store-missing',
    place,
    expected: 'a directory that is a store (tallypost init makes one)',
    got: found === null ? 'nothing there' : 'a file',
  });
}

/** Messages are named as in the store's listing, with or without `inbound/`. */
export function messageIdOf(given: string): string {
  return given.startsWith(keys.inbound) ? given.slice(keys.inbound.length) : given;
}

/** A point in time as people type it: a date (its beginning, UTC) or a time.
 *  @throws TallypostError usage */
export function readMoment(text: string, option: string): number {
  const ms = /^\d{4}-\d\d-\d\d/.test(text) ? Date.parse(text) : Number.NaN;
  if (Number.isNaN(ms))
    throw new TallypostError({
      code: 'usage',
      place: option,
      expected: 'a date such as 2026-03-01 or a time such as 2026-03-01T10:00:00Z',
      got: 'another text',
    });
  return ms;
}
