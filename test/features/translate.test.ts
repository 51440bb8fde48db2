import { describe, expect, it } from 'vitest';
import { createExtractor } from '../../src/features/extractor.ts';
import type { Schema } from '../../src/features/schema.ts';
import { translateFeatures } from '../../src/features/translate.ts';
import { exampleDesk, exampleKey, formOf, mailOf } from './example.ts';

const wider = {
  ...exampleDesk,
  ownAddresses: ['new@fenmarkwater.example', ...exampleDesk.ownAddresses],
  references: [{ id: 'job', pattern: 'J######' }, ...exampleDesk.references],
  fields: [{ form: 'contact', field: 'topic', values: ['A move', 'A leak'] }],
};
const old = createExtractor(exampleDesk, exampleKey);
const fresh = createExtractor(wider, exampleKey);
const slotOf = (schema: Schema, slots: readonly number[], id: string) => {
  const at = schema.slots.findIndex((slot) => slot.id === id);
  return schema.slots[at]!.values[slots[at]!];
};

describe('features carried over to another schema', () => {
  it('keep tokens and every slot that both have, by name', () => {
    const message = mailOf({
      text: 'Account FW-12345678: my bill',
      recipients: [{ address: 'billing@fenmarkwater.example', domain: 'fenmarkwater.example' }],
    });
    const before = old.extract(message);
    const after = translateFeatures(before, old.schema, fresh.schema)!;
    const wanted = fresh.extract(message);
    expect(after.schema).toBe(fresh.schema.id);
    expect(after.regions).toEqual(wanted.regions);
    // Everything is as if read from the message, but the slot that is new.
    for (const { id } of fresh.schema.slots)
      expect([id, slotOf(fresh.schema, after.slots, id)]).toEqual([
        id,
        id === 'reference:job' ? 'missing' : slotOf(fresh.schema, wanted.slots, id),
      ]);
    expect(slotOf(fresh.schema, after.slots, 'recipient')).toBe('billing@fenmarkwater.example');
  });

  it('turn a value that the new list does not have into other, and move the rest', () => {
    const translated = (topic: string) => {
      const features = old.extract(formOf('contact', { topic, details: 'please help' }));
      const { slots } = translateFeatures(features, old.schema, fresh.schema)!;
      return slotOf(fresh.schema, slots, 'field:contact/topic');
    };
    expect(['A bill', 'A leak', 'A move', 'nonsense'].map(translated)).toEqual([
      'other',
      'A leak',
      'A move',
      'other',
    ]);
  });

  it('are refused when tokens are drawn otherwise, or when they are not of the schema given', () => {
    const features = old.extract(mailOf());
    const [first, ...rest] = fresh.schema.regions;
    expect(
      translateFeatures(features, old.schema, { ...fresh.schema, version: fresh.schema.version + 1 }),
    ).toBeNull();
    expect(translateFeatures(features, old.schema, { ...fresh.schema, regions: rest })).toBeNull();
    expect(
      translateFeatures(features, old.schema, {
        ...fresh.schema,
        regions: [{ ...first!, tokensMax: 1 }, ...rest],
      }),
    ).toBeNull();
    expect(translateFeatures(features, fresh.schema, old.schema)).toBeNull();
  });
});
