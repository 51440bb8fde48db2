import { expect, it } from 'vitest';
import { Simulation } from './simulation.ts';

it('does the very same again under the same seed, call by call', async () => {
  const traceOf = async (seed: number): Promise<string[]> => {
    const lines: string[] = [];
    const simulation = new Simulation(seed);
    simulation.scheduler.trace = (line) => lines.push(line);
    await simulation.run();
    return lines;
  };
  for (const seed of [3, 42, 1234]) {
    const first = await traceOf(seed);
    expect(first.length).toBeGreaterThan(50);
    expect(await traceOf(seed)).toEqual(first);
  }
  expect(await traceOf(5)).not.toEqual(await traceOf(6));
});
