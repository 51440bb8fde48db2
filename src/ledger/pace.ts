import { bounds } from '../bounds.ts';
import { type Fault, TallypostError } from '../errors.ts';
import type { World } from './world.ts';

/** Waits before attempt number `attempt`, counted from 1: up to the length doubled each time, drawn at random, so that
 *  writers that collided do not collide again. */
export async function pause(world: World, attempt: number): Promise<void> {
  const lengthMs = Math.min(bounds.pauseMsMax, bounds.pauseMsMin * 2 ** (attempt - 1));
  await world.sleep(Math.ceil(world.random() * lengthMs));
}

/** Applies `work` to each item, at most `requestsAtOnceMax` at the same time; results in the items' order. */
export async function mapBounded<T, R>(items: readonly T[], work: (item: T) => Promise<R>): Promise<R[]> {
  const results = new Array<R>(items.length);
  let next = 0;
  const workers = Array.from({ length: Math.min(bounds.requestsAtOnceMax, items.length) }, async () => {
    while (next < items.length) {
      const i = next++;
      results[i] = await work(items[i]);
    }
  });
  await Promise.all(workers);
  return results;
}

/** What to report of a failure. Names no content: only our own errors speak for themselves. */
export function faultOf(error: unknown, place: string): Fault {
  if (error instanceof TallypostError)
    return { code: error.code, place: error.place, expected: error.expected, got: error.got };
  const code = isMistake(error) ? 'unexpected' : 'store-failed';
  const got = error instanceof Error ? error.name : 'a failure';
  return { code, place, expected: 'an answer of the store', got };
}

/** Failures of the store may pass. All other errors of our own, and mistakes in the program, stay however often one tries. */
export function isOfStore(error: unknown): boolean {
  return error instanceof TallypostError ? error.code.startsWith('store-') : !isMistake(error);
}

const lastingCodes = new Set(['store-full', 'store-refused', 'store-unsupported', 'store-missing']);

/** What the store will say again within any pause: somebody must make room, give leave, or name another place. */
export function isLasting(fault: Pick<Fault, 'code'>): boolean {
  return lastingCodes.has(fault.code);
}

function isMistake(error: unknown): boolean {
  return error instanceof TypeError || error instanceof ReferenceError || error instanceof RangeError;
}
