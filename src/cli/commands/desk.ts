import { readFile } from 'node:fs/promises';
import type { Command } from 'commander';
import { readDesk } from '../../desk/read-desk.ts';
import { TallypostError } from '../../errors.ts';
import { createExtractor, type Extractor } from '../../features/extractor.ts';
import type { Features } from '../../features/schema.ts';
import { translateFeatures } from '../../features/translate.ts';
import { readMessage } from '../../handlers/read-message.ts';
import { readManifest } from '../../ledger/commit.ts';
import { isTombstone } from '../../ledger/history.ts';
import { historyKey, readHistory } from '../../ledger/history-store.ts';
import { type RecountResult, recount } from '../../ledger/recount.ts';
import { decodeFeatures } from '../../model/codec-entries.ts';
import { fitTable } from '../../model/fit-table.ts';
import { keys } from '../../store/keys.ts';
import { plural } from '../layout.ts';
import { openSession, type StoreFlags, type StoreSession, withDryRun, withStore } from '../store-session.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

export function addDesk(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withDryRun(withStore(program.command('desk')))
    .description(
      "put another desk's file into a store; counts everything again first when it changes what is counted",
    )
    .argument('<file>', "the new desk's file")
    .action(async (file: string, flags: StoreFlags) =>
      end(await answer(terminal, flags.json === true, () => changeDesk(file, flags))),
    );
}

async function changeDesk(file: string, flags: StoreFlags): Promise<Answer> {
  const session = await openSession(flags.store);
  const { store } = session.world;
  const etag = (await store.head(keys.desk))?.etag ?? '';
  const bytes = await readFile(file).catch((cause: unknown) => {
    throw new TallypostError(
      { code: 'file-missing', place: file, expected: "a desk's file", got: 'none that can be read' },
      cause,
    );
  });
  const desk = readDesk(bytes, file);
  const extractor = createExtractor(desk, session.deps.tokenKey);
  // What is counted now may also be of another version of this program.
  const { manifest } = await readManifest(session.world);
  const counted = manifest.schema === '' ? session.extractor.schema.id : manifest.schema;
  const before = new Set(session.desk.queues.map(({ id }) => id));
  const after = new Set(desk.queues.map(({ id }) => id));
  const change = {
    opened: [...after].filter((id) => !before.has(id)),
    closed: [...before].filter((id) => !after.has(id)),
    countsOtherwise: extractor.schema.id !== counted,
  };
  if (flags.dryRun === true)
    return { json: { kind: 'dry-run', ...change }, text: describe(change, 'would be') };
  const read = { raw: 0, translated: 0 };
  const recounted = change.countsOtherwise ? await recountUnder(session, desk, extractor, read) : null;
  if (recounted?.repair === 'lost-race') {
    const text =
      'nothing was changed: confirmations were folded all the time; try again, or let them wait meanwhile';
    return { json: { kind: 'lost-race', ...change }, text, exitCode: exitCodes.failed };
  }
  const put = await store.put(keys.desk, bytes, { ifMatch: etag, contentType: 'application/json' });
  if (put.kind === 'lost')
    throw new TallypostError({
      code: 'desk-changed',
      place: keys.desk,
      expected: 'the file that stood there at the beginning',
      got: 'another one',
    });
  const again = recounted && { messages: recounted.messages, ...read, leftOut: recounted.unread };
  return {
    json: { kind: 'changed', ...change, recounted: again },
    text: [describe(change, 'is'), ...(again ? [describeRecount(again)] : [])].join('\n'),
  };
}

/** Counts every history under the new desk; the old one serves until that is committed. */
function recountUnder(
  { world, extractor: old }: StoreSession,
  desk: StoreSession['desk'],
  extractor: Extractor,
  read: { raw: number; translated: number },
): Promise<RecountResult> {
  const reread = async (message: string): Promise<Features | null> => {
    const found = await readMessage(world, keys.inbound + message, () => true);
    if (found?.message) {
      read.raw += 1;
      return extractor.extract(found.message);
    }
    const { stored } = await readHistory(world, message);
    const encoded = stored === null || isTombstone(stored) ? undefined : stored.features[old.schema.id];
    if (encoded === undefined) return null;
    const translated = translateFeatures(
      decodeFeatures(encoded, old.schema, historyKey(message)),
      old.schema,
      extractor.schema,
    );
    if (translated !== null) read.translated += 1;
    return translated;
  };
  return recount(world, desk, extractor.schema, { repair: true, fitModel: fitTable, reread });
}

interface Change {
  readonly opened: readonly string[];
  readonly closed: readonly string[];
  readonly countsOtherwise: boolean;
}

function describe({ opened, closed, countsOtherwise }: Change, is: string): string {
  return [
    `${keys.desk} ${is} replaced; functions look at it again within a minute`,
    ...(opened.length > 0 ? [`queues opened: ${opened.join(', ')}`] : []),
    ...(closed.length > 0
      ? [`queues gone: ${closed.join(', ')} (tallypost queue says what becomes of what they learned)`]
      : []),
    countsOtherwise
      ? 'it changes what is counted: every confirmed message is counted again under it first'
      : 'it changes nothing of what is counted',
  ].join('\n');
}

function describeRecount(again: {
  readonly messages: number;
  readonly raw: number;
  readonly translated: number;
  readonly leftOut: number;
}): string {
  return `counted ${plural(again.messages, 'message')} again: ${again.raw} read from their raw form, ${again.translated} carried over without it, ${again.leftOut} left out`;
}
