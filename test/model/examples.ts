import fc from 'fast-check';
import type { Features, Schema } from '../../src/features/schema.ts';
import type { Entry } from '../../src/model/counts.ts';

/** A small schema: two slots, three regions. */
export const schema: Schema = {
  id: '00112233445566aa',
  version: 1,
  slots: [
    { id: 'channel', group: 'channel', values: ['missing', 'other', 'mail', 'form'] },
    { id: 'hour', group: 'time', values: ['missing', 'other', 'day'] },
  ],
  regions: [
    { id: 'subject', tokensMax: 8 },
    { id: 'word', tokensMax: 16 },
    { id: 'pair', tokensMax: 16 },
  ],
};

export const queueNames = ['billing', 'leaks', 'moving'];

/** Tokens from a small pool, so that messages share them; some near the end of the 40-bit range. */
const token = fc.oneof(
  fc.nat(30),
  fc.nat(30).map((n) => 2 ** 40 - 1 - n),
  fc.nat(2 ** 40 - 1),
);

export const features: fc.Arbitrary<Features> = fc
  .tuple(
    fc.tuple(...schema.slots.map((slot) => fc.nat(slot.values.length - 1))),
    fc.tuple(...schema.regions.map((region) => fc.uniqueArray(token, { maxLength: region.tokensMax }))),
  )
  .map(([slots, regions]) => ({
    schema: schema.id,
    slots,
    regions: regions.map((tokens) => Float64Array.from(tokens).sort()),
  }));

export const column = fc.record({
  queue: fc.constantFrom(...queueNames),
  epoch: fc.integer({ min: 2900, max: 2906 }),
});

export const said = fc.option(
  fc.record({
    queue: fc.constantFrom(...queueNames),
    posterior: fc.double({ min: 0, max: 1, noNaN: true }),
    isAudit: fc.boolean(),
  }),
);

/** First confirmations: nothing taken out. */
export const confirmations: fc.Arbitrary<Entry[]> = fc.array(
  fc.record({ features, said, minus: fc.constant(null), plus: column }),
  { maxLength: 24 },
);

/** The entry that takes another's effect back. */
export function undone(entry: Entry): Entry {
  return { ...entry, minus: entry.plus, plus: entry.minus };
}
