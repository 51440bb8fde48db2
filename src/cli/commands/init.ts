import { randomBytes } from 'node:crypto';
import { readFile } from 'node:fs/promises';
import type { Command } from 'commander';
import { readDesk } from '../../desk/read-desk.ts';
import { TallypostError } from '../../errors.ts';
import { loadTokenKey } from '../../handlers/load-token-key.ts';
import { keys } from '../../store/keys.ts';
import { openStore } from '../../store/open-store.ts';
import { plural } from '../layout.ts';
import { type StoreFlags, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';
import { starterDesk } from './starter-desk.ts';

interface Flags extends StoreFlags {
  readonly desk?: string;
}

export function addInit(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('init')))
    .description("make a store: a desk's file to edit, and the secret under which words are hashed")
    .option('--desk <file>', "desk's file to put there instead of the one to begin with")
    .action(async (flags: Flags) => end(await answer(terminal, flags.json === true, () => init(flags))));
}

async function init(flags: Flags): Promise<Answer> {
  const file = flags.desk === undefined ? null : await readGiven(flags.desk);
  const bytes = file ?? new TextEncoder().encode(`${JSON.stringify(starterDesk, null, 2)}\n`);
  const desk = readDesk(bytes, flags.desk ?? 'the desk to begin with');
  const store = await openStore(flags.store);
  const isThere = (await store.head(keys.desk)) !== null;
  const hasKey = (await store.head(keys.tokenKey)) !== null || process.env.TALLYPOST_TOKEN_KEY !== undefined;
  if (flags.dryRun !== true) {
    if (!isThere) await store.put(keys.desk, bytes, { ifNoneMatch: '*', contentType: 'application/json' });
    await loadTokenKey(store, process.env.TALLYPOST_TOKEN_KEY, () => randomBytes(16));
  }
  const kind = flags.dryRun === true ? 'dry-run' : isThere && hasKey ? 'nothing-to-do' : 'made';
  const json = {
    kind,
    store: store.place,
    desk: isThere ? 'kept' : 'written',
    tokenKey: hasKey ? 'kept' : 'written',
    queues: desk.queues.map((queue) => queue.id),
  };
  const would = flags.dryRun === true ? 'would be ' : '';
  const text = [
    isThere
      ? `${keys.desk} is there already and stays as it is`
      : `${keys.desk} ${would}written: ${plural(desk.queues.length, 'queue')}, to be edited`,
    hasKey
      ? `${keys.tokenKey} is there already and stays as it is`
      : `${keys.tokenKey} ${would}written: keep it secret, and keep it: without it nothing learned can be read`,
    `mail and form JSON go to ${keys.inbound}, confirmations to ${keys.confirmations}; then: tallypost run --store ${flags.store}`,
  ].join('\n');
  return { json, text };
}

async function readGiven(file: string): Promise<Uint8Array> {
  return readFile(file).catch((cause: unknown) => {
    throw new TallypostError(
      { code: 'file-missing', place: file, expected: "a desk's file", got: 'none that can be read' },
      cause,
    );
  });
}
