import { randomBytes } from 'node:crypto';
import { type Command, InvalidArgumentError } from 'commander';
import { bounds } from '../../bounds.ts';
import { linkTo } from '../../settle/link.ts';
import { readSettleSecret } from '../../settle/secret.ts';
import { type Answer, answer, type Terminal } from '../terminal.ts';

interface Flags {
  readonly url: URL;
  readonly hours: number;
  readonly json?: boolean;
}

export function addLink(program: Command, terminal: Terminal, end: (code: number) => void): void {
  program
    .command('link')
    .argument('<name>', 'who will settle, as confirmations will say', readName)
    .description('make a link by which one person comes in to the deployed page for held messages, once')
    .requiredOption('--url <url>', 'the page: the stack’s output SettleUrl', readUrl)
    .option('--hours <number>', `until when it works, at most ${bounds.settleLinkHoursMax}`, readHours, 8)
    .option('--json', 'write the answer as JSON')
    .addHelpText('after', '\nTALLYPOST_SETTLE_SECRET: what links are signed with (output SettleSecretArn)')
    .action(async (by: string, flags: Flags) =>
      end(await answer(terminal, flags.json === true, async () => makeLink(by, flags))),
    );
}

function makeLink(by: string, { url, hours }: Flags): Answer {
  const secret = readSettleSecret(process.env.TALLYPOST_SETTLE_SECRET);
  const untilMs = Date.now() + hours * 3_600_000;
  const link = linkTo(secret, { url, by, untilMs, number: randomBytes(9).toString('hex') });
  const until = new Date(untilMs).toISOString();
  return {
    json: { link, by, until },
    text: `For ${by} alone, once, until ${until.slice(0, 16).replace('T', ' ')} UTC:\n\n  ${link}\n`,
  };
}

function readName(text: string): string {
  const name = text.trim();
  if (name === '' || /\p{Cc}/u.test(name) || name.length > bounds.confirmationLineCharsMax)
    throw new InvalidArgumentError(
      `Expected one line of 1 to ${bounds.confirmationLineCharsMax} characters.`,
    );
  return name;
}

function readUrl(text: string): URL {
  const url = URL.canParse(text) ? new URL(text) : null;
  if (url?.protocol !== 'https:') throw new InvalidArgumentError('Expected an https address.');
  return url;
}

function readHours(text: string): number {
  const hours = Number(text);
  if (!(hours > 0) || hours > bounds.settleLinkHoursMax)
    throw new InvalidArgumentError(`Expected more than 0 and at most ${bounds.settleLinkHoursMax}.`);
  return hours;
}
