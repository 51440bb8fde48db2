import { compact } from '../../src/ledger/compaction.ts';
import { foldClaims } from '../../src/ledger/fold.ts';
import type { World } from '../../src/ledger/world.ts';
import { claim, desk, schema } from '../ledger/fixture.ts';
import { bodyOf } from './claims.ts';
import { openPlace, type Place } from './place.ts';

/** What a delivery looks like between processes. */
export interface WireClaim {
  readonly message: string;
  readonly queue: string;
  readonly minute: number;
  readonly by: string;
}

export type Order =
  | { readonly kind: 'fold'; readonly claims: readonly WireClaim[] }
  | { readonly kind: 'compact' }
  /** Stores a message and marks it several times over. */
  | { readonly kind: 'mark'; readonly message: string };

/** One kind an outcome of a fold, in order; or the compaction's; or what was thrown. */
export type Answer =
  | { readonly kind: 'folded'; readonly outcomes: readonly string[]; readonly faults: readonly string[] }
  | { readonly kind: 'compacted'; readonly outcome: string }
  | { readonly kind: 'marked' }
  | { readonly kind: 'threw'; readonly error: string };

/** A process that folds and compacts on orders from its parent until it is killed. */
const place = JSON.parse(process.argv[2] as string) as Place;
const world: World = {
  store: await openPlace(place),
  nowMs: Date.now,
  random: Math.random,
  sleep: (ms) => new Promise((resolve) => setTimeout(resolve, ms)),
};
/** Claims of a killed process are taken over sooner than in production, or the race would wait more than it races. */
const patienceMs = 1500;

async function obey(order: Order): Promise<Answer> {
  if (order.kind === 'compact')
    return { kind: 'compacted', outcome: (await compact(world, desk, schema)).kind };
  if (order.kind === 'mark') return mark(order.message);
  const claims = order.claims.map(({ message, queue, minute, by }) => claim(message, queue, minute, by));
  const outcomes = await foldClaims(world, desk, schema, claims, { patienceMs });
  return {
    kind: 'folded',
    outcomes: outcomes.map((outcome) => outcome.kind),
    faults: outcomes.flatMap((outcome) => ('fault' in outcome ? [outcome.fault.code] : [])),
  };
}

async function mark(message: string): Promise<Answer> {
  const key = `inbound/${message}.eml`;
  await world.store.put(key, bodyOf(message), { ifNoneMatch: '*' });
  for (let times = 0; times < 3; times += 1) {
    const head = await world.store.head(key);
    if (head !== null)
      await world.store.replaceMetadata(key, { 'tallypost-queue': `q${times}` }, { ifMatch: head.etag });
  }
  return { kind: 'marked' };
}

process.on('message', async (order: Order) => {
  try {
    process.send?.(await obey(order));
  } catch (error) {
    process.send?.({ kind: 'threw', error: String(error) } satisfies Answer);
  }
});
process.on('disconnect', () => process.exit(0));
process.send?.('ready');
