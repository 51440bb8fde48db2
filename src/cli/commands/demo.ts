import { mkdir, readdir, rm, writeFile } from 'node:fs/promises';
import { join, relative } from 'node:path';
import { type Command, InvalidArgumentError } from 'commander';
import { TallypostError } from '../../errors.ts';
import { createDirectoryStore } from '../../store/directory.ts';
import type { DemoScenario } from '../demo/demo-scenario.ts';
import { describeDemo } from '../demo/describe-demo.ts';
import { type DemoPlay, playDemo } from '../demo/play-demo.ts';
import { summariseDemo } from '../demo/summarise-demo.ts';
import { createProgress } from '../progress.ts';
import { type Answer, answer, exitCodes, type Terminal } from '../terminal.ts';

interface Flags {
  readonly dir: string;
  readonly messages: number;
  readonly seed: number;
  readonly json?: boolean;
}

/** Bundled from the project's test data, beside the command line and no part of it. */
interface ScenarioModule {
  generateScenario(seed: number, options: { messages: number }): DemoScenario;
  deskJson(scenario: DemoScenario, atMs?: number): Uint8Array;
}

export function addDemo(program: Command, terminal: Terminal, end: (code: number) => void): void {
  program
    .command('demo')
    .description('play 120 days at the desk of the invented Fenmark Water in a fresh directory')
    .option('--dir <path>', 'where; the store of an earlier demo there is replaced', 'demo-store')
    .option('--messages <number>', 'how many arrive', readWhole(20, 100_000), 2400)
    .option('--seed <number>', 'another seed, other messages', readWhole(0, 2 ** 31), 1)
    .option('--json', 'answer in JSON')
    .action(async (flags: Flags) =>
      end(await answer(terminal, flags.json === true, () => demo(flags, terminal))),
    );
}

function readWhole(least: number, most: number) {
  return (text: string): number => {
    const value = Number(text);
    if (!Number.isSafeInteger(value) || value < least || value > most)
      throw new InvalidArgumentError(`Expected a whole number from ${least} to ${most}.`);
    return value;
  };
}

const markName = '.tallypost-demo';
const summaryName = 'demo-summary.json';

async function demo(flags: Flags, terminal: Terminal): Promise<Answer> {
  const startedMs = performance.now();
  const { generateScenario, deskJson } = await loadScenario();
  await clearDirectory(flags.dir);
  const scenario = generateScenario(flags.seed, { messages: flags.messages });
  const titles = titlesIn(deskJson(scenario));
  const progress = createProgress(terminal, flags.json === true);
  const play = await playDemo({
    store: createDirectoryStore(flags.dir),
    scenario,
    deskJson: (atMs) => deskJson(scenario, atMs),
    titleOf: (queue) => titles.get(queue) ?? queue,
    seed: flags.seed,
    onProgress: progress.show,
  }).finally(progress.end);
  const summary = { seconds: (performance.now() - startedMs) / 1000, ...summariseDemo(play, scenario) };
  await writeFile(join(flags.dir, summaryName), `${JSON.stringify(summary, null, 2)}\n`);
  const isRight = play.recount.differences === 0 && play.faults.length === 0;
  return {
    json: { store: flags.dir, ...summary },
    text: `${describeDemo(summary, terminal)}\n\n${whereToLook(flags.dir, play)}`,
    exitCode: isRight && play.troubles.length === 0 ? exitCodes.done : exitCodes.failed,
  };
}

async function loadScenario(): Promise<ScenarioModule> {
  const [scenario, desk] = [place('scenario.js'), place('desk.js')];
  try {
    return { ...(await import(scenario.href)), ...(await import(desk.href)) };
  } catch (cause) {
    throw new TallypostError(
      {
        code: 'demo-missing',
        place: scenario.pathname,
        expected: "the demo's messages, which npm run build makes in a checkout",
        got: 'none',
      },
      cause,
    );
  }
}

function place(name: string): URL {
  return new URL(`../demo/${name}`, import.meta.url);
}

/** Makes an empty directory; removes what stands there only when an earlier demo made it. */
async function clearDirectory(path: string): Promise<void> {
  const names: string[] = await readdir(path).catch((error: NodeJS.ErrnoException) => {
    if (error.code === 'ENOENT') return [];
    throw new TallypostError(
      { code: 'directory-unusable', place: path, expected: 'a directory', got: error.code ?? 'none' },
      error,
    );
  });
  if (names.length > 0 && !names.includes(markName))
    throw new TallypostError({
      code: 'directory-in-use',
      place: path,
      expected: 'an empty directory, or that of an earlier demo',
      got: `${names.length} other files`,
    });
  if (names.length > 0) await rm(path, { recursive: true });
  await mkdir(path, { recursive: true });
  await writeFile(join(path, markName), 'Made by tallypost demo, which may remove this directory.\n');
}

function titlesIn(desk: Uint8Array): Map<string, string> {
  const { queues } = JSON.parse(new TextDecoder().decode(desk)) as {
    queues: { id: string; title: string }[];
  };
  return new Map(queues.map(({ id, title }) => [id, title]));
}

function whereToLook(dir: string, play: DemoPlay): string {
  const script = relative('', process.argv[1] ?? '') || 'tallypost';
  const command = script.endsWith('.js') ? `node ${script}` : 'tallypost';
  const held = play.rows.findLast((row) => row.kind === 'held' && row.reason === 'unsure');
  const shown = held ?? play.rows.at(-1);
  const rows = [
    [join(dir, 'reports/latest.html'), 'the page for the lead: open it in a browser'],
    [join(dir, 'config/desk.json'), 'queues, costs and guards of the desk'],
    [join(dir, 'inbound'), 'the mail and the forms, as they arrived'],
    [join(dir, summaryName), 'all numbers of this page, and more'],
    [`${command} recount --store ${dir}`, ''],
  ];
  if (shown !== undefined)
    rows.push([`${command} explain --store ${dir} ${shown.message.key.slice('inbound/'.length)}`, '']);
  return `What to look at\n${rows.map(([what, why]) => `  ${what!.padEnd(36)}${why}`.trimEnd()).join('\n')}`;
}
