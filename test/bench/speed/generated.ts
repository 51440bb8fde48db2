import type { Desk } from '../../../src/desk/desk.ts';
import type { Features, Schema } from '../../../src/features/schema.ts';
import { decodeCounts } from '../../../src/model/codec-counts.ts';
import type { Counts, Entry } from '../../../src/model/counts.ts';
import { epochAt } from '../../../src/model/fold.ts';
import { createTally } from '../../../src/model/tally.ts';

/** Confirmed messages made of numbers, as many as wanted, each the same whenever it is asked for. */
export interface Generated {
  readonly desk: Desk;
  readonly schema: Schema;
  readonly queues: readonly string[];
  /** Features of message `i`, its queue, and when it was confirmed. */
  message(i: number): { readonly features: Features; readonly queue: string; readonly atMs: number };
}

type ByRegion = readonly [subject: number, word: number, pair: number, gram: number];

export interface GeneratedOptions {
  readonly queues: number;
  /** Distinct tokens of a message in each region. */
  readonly tokens: ByRegion;
  /** Words that can occur at all, by region: how much of each message is new. */
  readonly vocabularies: ByRegion;
  /** Words of each queue's own, a third of all tokens; 400 when left out. */
  readonly ownWords?: number;
  /** Messages that fill `weeks` weeks. */
  readonly messages: number;
  readonly weeks: number;
}

const startMs = Date.UTC(2024, 11, 2);
const weekMs = 7 * 24 * 3600 * 1000;
const ownShare = 0.35;

/** 300 tokens a message, as the mails of the demo have. */
export const ordinary: Pick<GeneratedOptions, 'tokens' | 'vocabularies'> = {
  tokens: [6, 90, 100, 104],
  vocabularies: [100_000, 300_000, 30_000_000, 300_000],
};

/** 150 tokens a message, as web forms and short mails have. */
export const short: Pick<GeneratedOptions, 'tokens' | 'vocabularies'> = {
  tokens: [4, 44, 46, 56],
  vocabularies: ordinary.vocabularies,
};

export function createGenerated(options: GeneratedOptions): Generated {
  const queues = Array.from({ length: options.queues }, (_, k) => `queue-${k}`);
  const schema: Schema = {
    id: '00000000000000b1',
    version: 1,
    slots: [
      { id: 'channel', group: 'channel', values: ['missing', 'other', 'mail', 'form'] },
      { id: 'hour', group: 'time', values: ['missing', 'other', 'night', 'day', 'evening'] },
    ],
    regions: ['subject', 'word', 'pair', 'gram'].map((id, g) => ({ id, tokensMax: options.tokens[g] })),
  };
  const desk: Desk = {
    version: 1,
    name: 'Fenmark Water',
    timeZone: 'UTC',
    ownAddresses: [],
    ownDomains: [],
    queues: queues.map((id) => ({ id, title: id, wrongRouteMinutes: 10 })),
    costs: { lookMinutes: 2, wrongRouteMinutes: 10 },
    senderClasses: [],
    references: [],
    forms: [],
    fields: [],
    guards: [],
    auditShare: 0,
    halfLifeDays: null,
  };
  return {
    desk,
    schema,
    queues,
    message(i) {
      const next = createNext(i);
      const below = (limit: number) => Math.floor(next() * limit);
      const k = below(queues.length);
      const slots = [2 + below(2), 2 + below(3)];
      const regions = options.tokens.map((count, g) => {
        const words = { own: options.ownWords ?? 400, all: options.vocabularies[g] };
        return drawTokens(next, count, g, k, words);
      });
      const atMs = startMs + Math.floor((i / options.messages) * options.weeks * weekMs);
      return { features: { schema: schema.id, slots, regions }, queue: queues[k], atMs };
    },
  };
}

/** sfc32 (Chris Doty-Humphrey, PractRand, public domain) seeded by a message's number: 128 bits of state, so that a million
 *  messages do not share stretches of one sequence. */
function createNext(seed: number): () => number {
  let [a, b, c, counter] = [0x9e3779b9, 0x243f6a88, seed | 0, 1];
  const next = (): number => {
    const sum = (a + b + counter) | 0;
    counter = (counter + 1) | 0;
    a = b ^ (b >>> 9);
    b = (c + (c << 3)) | 0;
    c = (((c << 21) | (c >>> 11)) + sum) | 0;
    return (sum >>> 0) / 2 ** 32;
  };
  for (let i = 0; i < 12; i++) next();
  return next;
}

/** Zipf's law with exponent 1: rank = V^u for uniform u. */
function drawTokens(
  next: () => number,
  count: number,
  region: number,
  queue: number,
  words: { readonly own: number; readonly all: number },
): Float64Array {
  const found = new Set<number>();
  while (found.size < count) {
    const isOwn = next() < ownShare;
    const rank = Math.floor((isOwn ? words.own : words.all) ** next());
    found.add(scatter(rank, isOwn ? queue + 1 : 0, region));
  }
  return Float64Array.from(found).sort();
}

/** Spreads ranks over 40 bits, as the hash of a word would. */
function scatter(rank: number, space: number, region: number): number {
  const low = Math.imul(
    Math.imul(rank, 0x9e3779b1) ^ Math.imul(space * 8 + region + 1, 0x85ebca6b),
    0xc2b2ae35,
  );
  const mixed = (low ^ (low >>> 15)) >>> 0;
  return (Math.imul(mixed, 0x27d4eb2f) >>> 24) * 2 ** 32 + mixed;
}

export function entryOf(generated: Generated, i: number): Entry {
  const { features, queue, atMs } = generated.message(i);
  return { features, said: null, minus: null, plus: { queue, epoch: epochAt(atMs) } };
}

/** Cells of all regions: counts that are not zero. */
export function cellsOf(counts: Counts): number {
  return counts.regions.reduce((sum, region) => sum + region.column.length, 0);
}

/** Counts of the first `count` messages. */
export function countsOf(generated: Generated, count: number): Counts {
  const tally = createTally(generated.schema);
  for (let i = 0; i < count; i++) tally.add([entryOf(generated, i)]);
  return decodeCounts(tally.sum(null, 'generated').bytes, generated.schema, 'generated');
}
