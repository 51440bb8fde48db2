import type { Desk } from '../../src/desk/desk.ts';
import type { Features, Schema } from '../../src/features/schema.ts';
import { readManifest } from '../../src/ledger/commit.ts';
import { foldClaims } from '../../src/ledger/fold.ts';
import { readCounts } from '../../src/ledger/objects.ts';
import type { Claim, FoldOutcome, World } from '../../src/ledger/world.ts';
import { decodeCounts } from '../../src/model/codec-counts.ts';
import type { Counts, Said } from '../../src/model/counts.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import type { Store } from '../../src/store/store.ts';

/** Two slots and one region: enough for every cell to be looked at. */
export const schema: Schema = {
  id: '00000000000000a1',
  version: 1,
  slots: [
    { id: 'channel', group: 'facts', values: ['missing', 'other', 'mail', 'form'] },
    { id: 'reply', group: 'facts', values: ['missing', 'other', 'no', 'yes'] },
  ],
  regions: [{ id: 'word', tokensMax: 64 }],
};

export const desk: Desk = {
  version: 1,
  name: 'Fenmark Water',
  timeZone: 'UTC',
  ownAddresses: [],
  ownDomains: [],
  queues: ['billing', 'leaks', 'meters', 'moving'].map((id) => ({ id, title: id, wrongRouteMinutes: 10 })),
  costs: { lookMinutes: 2, wrongRouteMinutes: 10 },
  senderClasses: [],
  references: [],
  forms: [],
  fields: [],
  guards: [],
  auditShare: 0,
  halfLifeDays: null,
};

/** 2026-03-02T00:00:00Z, a Monday. */
export const startMs = Date.UTC(2026, 2, 2);
/** floor(startMs / 7 days) = floor(20514 / 7): day 20514 since 1970 is a Monday, weeks since 1970 begin on Thursdays. */
export const startWeek = 2930;

/** xorshift32: uniform enough for ids and pauses, and the same everywhere. */
export function seeded(seed: number): () => number {
  let x = (seed * 2654435761 + 1) >>> 0 || 1;
  return () => {
    x ^= x << 13;
    x ^= x >>> 17;
    x ^= x << 5;
    x >>>= 0;
    return x / 2 ** 32;
  };
}

export interface Clock {
  ms: number;
}

export function testWorld(seed = 1, store: Store | null = null): World & { readonly clock: Clock } {
  const clock = { ms: startMs };
  return {
    clock,
    store: store ?? createMemoryStore(() => clock.ms),
    nowMs: () => clock.ms++,
    random: seeded(seed),
    sleep: async (ms) => {
      clock.ms += ms;
    },
  };
}

/** Token that only this message has, and one that all have. */
export function tokenOf(message: string): number {
  let h = 0x811c9dc5;
  for (let i = 0; i < message.length; i++) h = Math.imul(h ^ message.charCodeAt(i), 0x01000193) >>> 0;
  return 1000 + h;
}
export const commonToken = 7;

export function featuresOf(message: string): Features {
  const isForm = tokenOf(message) % 2 === 1;
  return {
    schema: schema.id,
    slots: [isForm ? 3 : 2, 2],
    regions: [Float64Array.of(commonToken, tokenOf(message))],
  };
}

/** `minute` after the start. */
export function claim(
  message: string,
  queue: string,
  minute = 0,
  by = 'ann',
  said: Said | null = null,
): Claim {
  const at = new Date(startMs + minute * 60_000).toISOString();
  return { confirmation: { message, queue, by, at }, features: featuresOf(message), said };
}

export function fold(world: World, ...claims: Claim[]): Promise<FoldOutcome[]> {
  return foldClaims(world, desk, schema, claims);
}

export async function countsNow(world: World): Promise<Counts> {
  const { bytes } = await readCounts(world, schema, (await readManifest(world)).manifest);
  return decodeCounts(bytes, schema, 'counts');
}

/** Where each message stands, told from the table alone by the token that only it has: `billing`, or `billing+leaks`, or
 *  `2*billing`; messages that stand nowhere are left out. */
export async function standings(world: World, messages: readonly string[]): Promise<Record<string, string>> {
  const counts = await countsNow(world);
  const [region] = counts.regions;
  const found: Record<string, string> = {};
  for (const message of messages) {
    const row = region.tokens.indexOf(tokenOf(message));
    if (row < 0) continue;
    const cells = [];
    for (let i = region.start[row]; i < region.start[row + 1]; i++) {
      const { queue } = counts.columns[region.column[i]];
      cells.push(region.count[i] === 1 ? queue : `${region.count[i]}*${queue}`);
    }
    found[message] = cells.join('+');
  }
  return found;
}

export async function keysOf(store: Store, prefix = ''): Promise<string[]> {
  const found: string[] = [];
  for await (const { key } of store.list(prefix)) found.push(key);
  return found;
}

/** Counts the calls of a store by name. */
export function countingStore(inner: Store): { store: Store; calls: Record<string, number> } {
  const calls: Record<string, number> = {};
  const store = new Proxy(inner, {
    get(target, name: keyof Store) {
      const member = target[name];
      if (typeof member !== 'function') return member;
      return (...args: unknown[]) => {
        calls[name] = (calls[name] ?? 0) + 1;
        return (member as (...a: unknown[]) => unknown).apply(target, args);
      };
    },
  });
  return { store, calls };
}

/** Runs `act` until it puts a key that starts so: its process dies there, that call never returns. */
export function dieAt(inner: Store, prefix: string, act: (store: Store) => Promise<unknown>): Promise<void> {
  return new Promise((died) => {
    const put: Store['put'] = (key, body, options) => {
      if (!key.startsWith(prefix)) return inner.put(key, body, options);
      died();
      return new Promise(() => {});
    };
    void act({ ...inner, put });
  });
}
