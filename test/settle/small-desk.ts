import type { HandlerDeps, LogLine } from '../../src/handlers/handler-deps.ts';
import { createDeskLoader } from '../../src/handlers/load-desk.ts';
import { createLocalRunner } from '../../src/handlers/local-runner.ts';
import { readMessage } from '../../src/handlers/read-message.ts';
import { createBenchOpener } from '../../src/handlers/settle-bench.ts';
import type { World } from '../../src/ledger/world.ts';
import { parseForm } from '../../src/message/form.ts';
import { parseMail } from '../../src/message/mail.ts';
import type { Message } from '../../src/message/message.ts';
import { keys } from '../../src/store/keys.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';
import { deskJson } from '../scenario/desk.ts';
import { createChance } from '../scenario/random.ts';
import { generateScenario, type ScenarioMessage } from '../scenario/scenario.ts';

export interface SmallDesk {
  readonly world: World;
  readonly store: Store;
  readonly deps: HandlerDeps;
  readonly runner: ReturnType<typeof createLocalRunner>;
  readonly messages: readonly ScenarioMessage[];
  readonly logged: readonly LogLine[];
  setNow(ms: number): void;
  openBench: ReturnType<typeof createBenchOpener>;
  readMessage(key: string): ReturnType<typeof readParsed>;
  /** A message of the scenario, parsed. */
  read(message: ScenarioMessage): Promise<Message>;
}

export const smallTokenKey = new Uint8Array(16).fill(5);

/** A desk that learned the first `learned` messages of a small scenario and then routed those up to `routed`, which nobody
 *  confirmed; the rest never came in. */
export async function playSmallDesk(
  learned: number,
  all: number,
  routed = all,
  store: Store = createMemoryStore(),
): Promise<SmallDesk> {
  const { messages } = generateScenario(4, { messages: all });
  const chance = createChance(9);
  let nowMs = messages[0]!.arrivesAtMs;
  const world: World = { store, nowMs: () => nowMs, random: chance.next, sleep: async () => {} };
  const logged: LogLine[] = [];
  const deps: HandlerDeps = {
    world,
    loadDesk: createDeskLoader(world, 0),
    tokenKey: smallTokenKey,
    log: (line) => logged.push(line),
  };
  await store.put(keys.desk, deskJson(), { contentType: 'application/json' });
  const runner = createLocalRunner(deps);
  const feed = async (part: readonly ScenarioMessage[]) => {
    for (const { key, bytes, contentType } of part) await store.put(key, bytes, { contentType });
    nowMs = part.at(-1)!.arrivesAtMs;
    await runner.run({ segmentsMax: Number.POSITIVE_INFINITY });
  };
  const confirm = async (part: readonly ScenarioMessage[]) => {
    for (const [i, { key, trueQueue }] of part.entries()) {
      const drop = {
        message: key.slice(keys.inbound.length),
        queue: trueQueue,
        by: 'a.tolland',
        at: new Date(nowMs).toISOString(),
      };
      await store.put(`${keys.confirmations}small-${nowMs}-${i}.json`, Buffer.from(JSON.stringify(drop)));
    }
    await runner.run({ segmentsMax: 0 });
  };
  const half = Math.floor(learned / 2);
  await feed(messages.slice(0, half));
  await confirm(messages.slice(0, half));
  await feed(messages.slice(half, learned));
  await confirm(messages.slice(half, learned));
  await feed(messages.slice(learned, routed));
  return {
    world,
    store,
    deps,
    runner,
    messages,
    logged,
    setNow: (ms) => {
      nowMs = ms;
    },
    openBench: createBenchOpener(deps),
    readMessage: (key) => readParsed(world, key),
    read: async ({ bytes, contentType }) =>
      contentType === 'application/json' ? parseForm(bytes) : parseMail(bytes, { nowMs: world.nowMs }),
  };
}

async function readParsed(world: World, key: string) {
  return (await readMessage(world, key, () => true))?.message ?? null;
}
