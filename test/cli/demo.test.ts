import { describe, expect, it } from 'vitest';
import { createRandom } from '../../src/cli/demo/demo-clock.ts';
import { describeDemo } from '../../src/cli/demo/describe-demo.ts';
import { playDemo } from '../../src/cli/demo/play-demo.ts';
import { summariseDemo } from '../../src/cli/demo/summarise-demo.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { deskJson } from '../scenario/desk.ts';
import { generateScenario } from '../scenario/scenario.ts';
import { runCli } from './run-cli.ts';

const seed = 3;
const messages = 60;

async function play() {
  const scenario = generateScenario(seed, { messages });
  const store = createMemoryStore();
  const played = await playDemo({
    store,
    scenario,
    deskJson: (atMs) => deskJson(scenario, atMs),
    titleOf: () => 'New connections',
    seed,
    onProgress: () => {},
  });
  return { scenario, store, played, summary: summariseDemo(played, scenario) };
}

describe('the demo', () => {
  it('routes every message once, folds every confirmation, and the recount agrees', async () => {
    const { scenario, played, summary, store } = await play();
    expect(played.troubles).toEqual([]);
    expect(new Set(played.rows.map((row) => row.message.key)).size).toBe(messages);
    const said = scenario.messages.flatMap((message) => message.confirmations).length;
    expect(summary.confirmations).toEqual({ folded: said });
    expect(summary.faults).toEqual([]);
    expect(summary.recount.differences).toBe(0);
    expect(summary.recount.messages).toBe(
      scenario.messages.filter((message) => message.confirmations.length > 0).length,
    );
    expect(summary.months.reduce((sum, month) => sum + month.messages, 0)).toBe(messages);
    expect(summary.openings[0]).toMatchObject({ queue: 'new-connections', before: 'moving-home' });
    // The queue that opens on the way is in the desk's file at the end, with its title.
    const desk = await store.get('config/desk.json');
    expect(desk.kind === 'found' && new TextDecoder().decode(desk.object.body)).toContain('New connections');
  });

  it('is the same for the same seed, to the last number', async () => {
    const [a, b] = [await play(), await play()];
    expect(a.summary).toEqual(b.summary);
  });

  it('is told in words', async () => {
    const { summary } = await play();
    const plain = (text: string) => text;
    const colours = { bold: plain, dim: plain, green: plain, red: plain } as never;
    const text = describeDemo(
      { ...summary, seconds: 12 },
      { out: () => {}, err: () => {}, isWatched: false, colours },
    );
    expect(text).toContain('60 messages');
    expect(text).toContain('0 cells differ');
    expect(text).toContain('A queue opens: new-connections, 2026-02-24');
  });

  it('needs its messages, which a checkout builds, and says so', async () => {
    const { code, json } = await runCli('demo', '--json');
    expect([code, json().error.code]).toEqual([2, 'demo-missing']);
  });
});

it('the dice of a demo are even and repeat themselves', () => {
  const [a, b] = [createRandom(5), createRandom(5)];
  const drawn = Array.from({ length: 10_000 }, a);
  expect(drawn.slice(0, 50)).toEqual(Array.from({ length: 50 }, b));
  // Mean of a uniform draw 0.5, standard error of 10,000 of them 0.0029.
  expect(drawn.reduce((sum, x) => sum + x, 0) / 10_000).toBeCloseTo(0.5, 1);
  expect(Math.min(...drawn)).toBeGreaterThanOrEqual(0);
  expect(Math.max(...drawn)).toBeLessThan(1);
});
