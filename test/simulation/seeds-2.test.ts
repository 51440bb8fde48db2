import { expect, it } from 'vitest';
import { runSeeds } from './seeds.ts';

// Two files, so that two workers share the time.
it('keeps every property under seeds 1001 to 2000', async () => {
  const { versions, faults, crashes } = await runSeeds(1001, 2001);
  // A run that does nothing finds nothing.
  expect(versions).toBeGreaterThan(5000);
  expect(faults).toBeGreaterThan(1000);
  expect(crashes).toBeGreaterThan(400);
}, 300_000);
