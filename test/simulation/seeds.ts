import { Simulation } from './simulation.ts';

/** Runs seeds `from` up to and without `until`; the title of what it throws says how to run the seed again. */
export async function runSeeds(
  from: number,
  until: number,
): Promise<{ versions: number; faults: number; crashes: number }> {
  const sum = { versions: 0, faults: 0, crashes: 0 };
  for (let seed = from; seed < until; seed++) {
    try {
      const { versions, faults, crashes } = await new Simulation(seed).run();
      sum.versions += versions;
      sum.faults += faults;
      sum.crashes += crashes;
    } catch (error) {
      throw new Error(`seed ${seed} fails; again: npm run simulate -- --seeds 1 --from ${seed} --trace`, {
        cause: error,
      });
    }
  }
  return sum;
}
