import type { Command } from 'commander';
import type { Decision } from '../../decision/decision.ts';
import { TallypostError } from '../../errors.ts';
import { type Balance, weighEvidence } from '../../explain/balance.ts';
import { oddsInWords, signedDecibans } from '../../explain/odds-words.ts';
import { readMessage } from '../../handlers/read-message.ts';
import { decideMessage } from '../../handlers/route-object.ts';
import { createWorkbenchOpener } from '../../handlers/workbench.ts';
import { explainParts } from '../../model/posterior-of.ts';
import { keys } from '../../store/keys.ts';
import { columns, percent } from '../layout.ts';
import { messageIdOf, openSession, type StoreFlags, withStore } from '../store-session.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags extends StoreFlags {
  readonly queue?: string;
  readonly against?: string;
}

export function addExplain(program: Command, terminal: Terminal, end: (code: number) => void): void {
  withStore(program.command('explain'))
    .description('say what speaks for and against the likeliest queues of a message, word by word')
    .argument('<message>', 'the message, as its key below inbound/')
    .option('--queue <id>', 'weigh this queue instead of the likeliest one')
    .option('--against <id>', 'weigh against this queue instead of the next likely one')
    .action(async (message: string, flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => explain(message, flags, terminal))),
    );
}

const itemsShown = 12;

async function explain(given: string, flags: Flags, terminal: Terminal): Promise<Answer> {
  const { deps, world } = await openSession(flags.store);
  const message = messageIdOf(given);
  const key = keys.inbound + message;
  const found = await readMessage(world, key, () => true);
  if (found === null || found.message === null)
    throw new TallypostError({ code: 'message-missing', place: key, expected: 'a message', got: 'nothing' });
  const bench = await createWorkbenchOpener(deps)();
  const { decision, posterior } = decideMessage(deps, bench, key, found.message);
  const ranked = [...posterior.queues]
    .map((queue, k) => ({ queue, posterior: posterior.probability[k]! }))
    .sort((a, b) => b.posterior - a.posterior);
  const queue = pick(ranked, flags.queue, '--queue', ranked[0]!.queue);
  const next = ranked.find((each) => each.queue !== queue) ?? ranked[0]!;
  const rival = pick(ranked, flags.against, '--against', next.queue);
  const { scorer } = bench.model;
  const balance = weighEvidence(
    explainParts(scorer, bench.extractor.extract(found.message)),
    scorer.queues,
    queue,
    rival,
    bench.extractor.words(found.message),
  );
  const written = Object.fromEntries(
    Object.entries(found.head.metadata)
      .filter(([name]) => name.startsWith('tallypost-'))
      .map(([name, value]) => [name.slice('tallypost-'.length), value]),
  );
  const json = {
    message,
    written,
    now: { model: bench.model.version, decision, posteriors: ranked },
    tokens: posterior.tokens,
    knownTokens: posterior.knownTokens,
    defects: found.message.defects,
    balance,
  };
  return { json, text: describe(json, terminal) };
}

function pick(
  ranked: readonly { readonly queue: string }[],
  given: string | undefined,
  option: string,
  usual: string,
): string {
  if (given === undefined) return usual;
  if (ranked.some(({ queue }) => queue === given)) return given;
  throw new TallypostError({
    code: 'queue-unknown',
    place: option,
    expected: `one of ${ranked.map(({ queue }) => queue).join(', ')}`,
    got: JSON.stringify(given),
  });
}

interface Explained {
  readonly message: string;
  readonly written: Readonly<Record<string, string>>;
  readonly now: {
    readonly model: number;
    readonly decision: Decision;
    readonly posteriors: readonly { readonly queue: string; readonly posterior: number }[];
  };
  readonly tokens: number;
  readonly knownTokens: number;
  readonly defects: readonly { readonly code: string; readonly place: string }[];
  readonly balance: Balance;
}

function describe(explained: Explained, { colours }: Terminal): string {
  const { bold, dim } = colours;
  const { written, now, balance, defects } = explained;
  const shown = now.posteriors.filter((each, rank) => rank < 3 || each.posterior >= 0.01);
  const lines = [
    bold(explained.message),
    written.decision === undefined
      ? 'not routed yet'
      : `written on it: ${written.decision}${written.queue === undefined ? '' : ` to ${written.queue}`}` +
        `${written.reason === undefined ? '' : ` (${written.reason})`}` +
        `${written.posterior === undefined ? '' : `, posterior ${percent(Number(written.posterior))}`}` +
        `, by version ${written.model ?? 'unknown'}`,
    `by version ${now.model}, as of now: ${decisionInWords(now.decision)}`,
    '',
    columns(
      shown.map(({ queue, posterior }) => [percent(posterior, 2), queue]),
      ['right'],
    ),
    dim(`${explained.knownTokens} of its ${explained.tokens} tokens are known`),
    '',
    bold(`${balance.queue} against ${balance.rival}: ${signedDecibans(balance.decibans)} decibans`),
    dim(
      `${leaning(balance)}; 10 decibans are odds of 10 to 1; + speaks for ${balance.queue}, − for ${balance.rival}`,
    ),
  ];
  for (const group of balance.groups) {
    lines.push('', `${signedDecibans(group.decibans).padStart(7)}  ${bold(group.title)}`);
    for (const item of group.items.slice(0, itemsShown))
      lines.push(`${signedDecibans(item.decibans).padStart(7)}    ${item.label}`);
    const rest = group.items.slice(itemsShown);
    if (rest.length > 0) {
      const sum = rest.reduce((total, item) => total + item.decibans, 0);
      lines.push(dim(`${signedDecibans(sum).padStart(7)}    ${rest.length} more`));
    }
  }
  if (defects.length > 0)
    lines.push('', dim(`on record: ${defects.map(({ code, place }) => `${code} (${place})`).join(', ')}`));
  return lines.join('\n');
}

function leaning({ queue, rival, decibans }: Balance): string {
  const odds = oddsInWords(decibans);
  return odds.includes(' to 1') ? `${odds} for ${decibans < 0 ? rival : queue}` : odds;
}

function decisionInWords(decision: Decision): string {
  if (decision.kind === 'guarded') return `sent to ${decision.queue} by the guard ${decision.guard}`;
  if (decision.kind === 'routed')
    return `routed to ${decision.queue}, expected loss ${decision.expectedMinutes.toFixed(2)} minutes`;
  return `held (${decision.reason})${decision.queue === null ? '' : `, likeliest ${decision.queue}`}`;
}
