import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { TallypostError } from '../../src/errors.ts';
import { ByteReader, ByteWriter, seal } from '../../src/model/bytes.ts';
import { decodeCounts, encodeCounts } from '../../src/model/codec-counts.ts';
import {
  decodeEntries,
  decodeFeatures,
  encodeEntries,
  encodeFeatures,
} from '../../src/model/codec-entries.ts';
import { decodeTable, encodeTable } from '../../src/model/codec-table.ts';
import type { Entry } from '../../src/model/counts.ts';
import { defaultFit } from '../../src/model/fit.ts';
import { emptyCounts, foldEntries } from '../../src/model/fold.ts';
import { serve } from '../../src/model/served-table.ts';
import { confirmations, features, schema } from './examples.ts';

const empty = emptyCounts(schema);
const codeOf = (act: () => unknown): string => {
  try {
    act();
  } catch (error) {
    if (error instanceof TallypostError) return error.code;
    throw error;
  }
  return 'accepted';
};

describe('encode, then decode, is the identity', () => {
  test('of counts', () => {
    fc.assert(
      fc.property(confirmations, (entries) => {
        const counts = foldEntries(empty, entries);
        expect(decodeCounts(encodeCounts(counts), schema, 'base')).toEqual(counts);
      }),
    );
  });

  test('of segments', () => {
    fc.assert(
      fc.property(confirmations, (entries) => {
        const mixed = entries.map(
          (e, i): Entry => (i % 3 === 0 ? { ...e, minus: e.plus, plus: i % 2 ? null : e.plus } : e),
        );
        expect(decodeEntries(encodeEntries(schema, mixed), schema, 'segment')).toEqual(mixed);
      }),
    );
  });

  test('of features as text', () => {
    fc.assert(
      fc.property(features, (f) => {
        expect(decodeFeatures(encodeFeatures(f), schema, 'history')).toEqual(f);
      }),
    );
  });

  test('of served tables, aged or not', () => {
    fc.assert(
      fc.property(confirmations, fc.constantFrom(null, 3, 30), (entries, halfLifeDays) => {
        const table = serve(foldEntries(empty, entries), defaultFit(schema), { halfLifeDays });
        expect(decodeTable(encodeTable(table), schema, 'table')).toEqual(table);
      }),
    );
  });

  test('of a served table in the first layout, to which tables of few queues were written otherwise', () => {
    // What this version of the project wrote before cells were packed, for these three messages.
    const bytes = Buffer.from(
      '545002015601000000112233445566aadf160000000000000000020200000000c9017b2276657273696f6e223a312c22626c6f636b73223a5b5d2c22' +
        '62696173223a7b7d2c22616c706861223a312c2262657461223a7b226368616e6e656c223a312c22686f7572223a317d2c22686f6c64223a7b227365' +
        '656e4d696e223a7b7d2c2272656c6576616e63654d696e223a302c227370617265734e6577223a747275657d2c2272656c696162696c697479223a7b' +
        '226c6f674f646473223a6e756c6c2c2273696e6365223a5b5d7d2c226c6f674c6f7373223a6e756c6c2c226d65737361676573223a307d020762696c' +
        '6c696e67056c65616b7302000001000102000000000102000000000000010201020207010300020602020203010400020002' +
        '00'.repeat(68) +
        '677db86c',
      'hex',
    );
    const features = {
      schema: schema.id,
      slots: [2, 2],
      regions: [Float64Array.of(7), Float64Array.of(3, 5), new Float64Array(0)],
    };
    const short = { ...features, regions: [Float64Array.of(9), new Float64Array(0), new Float64Array(0)] };
    const entryOf = (f: typeof features, queue: string, epoch: number): Entry => ({
      features: f,
      said: null,
      minus: null,
      plus: { queue, epoch },
    });
    const counts = foldEntries(empty, [
      entryOf(features, 'leaks', 2911),
      entryOf(features, 'billing', 2910),
      entryOf(short, 'leaks', 2911),
    ]);
    const fit = { ...defaultFit(schema), blocks: [] };
    const table = serve(counts, fit, { halfLifeDays: null });
    expect(decodeTable(bytes, schema, 'table')).toEqual(table);
    const packed = encodeTable(table);
    // Two tokens a region: 38 low bits, then 0, or 1 and 0; whether there is one cell; its column. Subjects 7 (in both queues)
    // and 9 (in one): 40 + 41 bits are 11 bytes for 2 and the byte of 9's cell. Words 3 and 5 (both in both): 40 + 40 bits are
    // 10 bytes for 2.
    // No bursts: 1 byte for the groups, 2 for their columns, an excess of 2 + 3 · 2 + 64, and "[]" with its length.
    expect(packed.length).toBe(bytes.length + (11 - 3) + (10 - 2) + (1 + 2 + 72 + 3));
    expect(decodeTable(packed, schema, 'table')).toEqual(table);
  });

  test('of whole numbers up to 2^53 - 1', () => {
    fc.assert(
      fc.property(fc.array(fc.oneof(fc.nat(300), fc.maxSafeNat())), (numbers) => {
        const out = new ByteWriter();
        for (const n of numbers) out.varint(n);
        const reader = new ByteReader(out.written(), 'numbers');
        expect(numbers.map(() => reader.varint())).toEqual(numbers);
        reader.end();
      }),
    );
  });
});

describe('damaged bytes are refused', () => {
  const entry: Entry = {
    features: {
      schema: schema.id,
      slots: [2, 2],
      regions: [Float64Array.of(7), Float64Array.of(3, 5), new Float64Array(0)],
    },
    said: null,
    minus: null,
    plus: { queue: 'billing', epoch: 2910 },
  };
  const counts = foldEntries(empty, [entry]);
  const whole = encodeCounts(counts);

  test('cut at any byte', () => {
    for (let length = 0; length < whole.length; length++) {
      expect(codeOf(() => decodeCounts(whole.subarray(0, length), schema, 'base'))).toBe('bytes-truncated');
    }
  });

  test('any single bit changed', () => {
    for (let bit = 0; bit < whole.length * 8; bit++) {
      const altered = whole.slice();
      altered[bit >> 3] ^= 1 << (bit & 7);
      expect(['bytes-altered', 'bytes-truncated', 'format-unknown']).toContain(
        codeOf(() => decodeCounts(altered, schema, 'base')),
      );
    }
  });

  test('bytes appended', () => {
    expect(codeOf(() => decodeCounts(Uint8Array.of(...whole, 0), schema, 'base'))).toBe('bytes-altered');
  });

  test('another schema, another kind, something else', () => {
    expect(codeOf(() => decodeCounts(whole, { ...schema, id: 'ffffffffffffffff' }, 'base'))).toBe(
      'schema-mismatch',
    );
    expect(codeOf(() => decodeEntries(whole, schema, 'segment'))).toBe('format-unknown');
    expect(
      codeOf(() => decodeCounts(new TextEncoder().encode('Dear Fenmark Water, my meter'), schema, 'base')),
    ).toBe('format-unknown');
  });

  test('well sealed counts that break the identity name slot, column and both sums', () => {
    const broken = { ...counts, slots: [counts.slots[0], Float64Array.of(0, 0, 2)] };
    expect(() => decodeCounts(encodeCounts(broken), schema, 'model/bases/x')).toThrow(
      'identity-broken at model/bases/x, slot hour, column billing@2910: expected counts that sum to 1, got 2',
    );
  });

  test('a well sealed table whose cells exceed its messages or totals', () => {
    const region = counts.regions[1];
    const over = {
      ...counts,
      regions: counts.regions.map((r) => (r === region ? { ...r, count: Float64Array.of(2, 1) } : r)),
    };
    expect(codeOf(() => decodeCounts(encodeCounts(over), schema, 'base'))).toBe('counts-broken');
    const short = {
      ...counts,
      regions: counts.regions.map((r) => (r === region ? { ...r, total: Float64Array.of(1) } : r)),
    };
    expect(codeOf(() => decodeCounts(encodeCounts(short), schema, 'base'))).toBe('identity-broken');
  });

  test('random payloads under a right check sum give an error of our own or counts that pass the check', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 200 }), (payload) => {
        codeOf(() => decodeCounts(seal('counts', schema.id, payload), schema, 'base'));
        codeOf(() => decodeEntries(seal('entries', schema.id, payload), schema, 'segment'));
        codeOf(() =>
          decodeFeatures(
            Buffer.from(seal('features', schema.id, payload)).toString('base64'),
            schema,
            'history',
          ),
        );
      }),
      { numRuns: 1000 },
    );
  });

  test('features with more tokens than the region allows, or a slot value that is not in the list', () => {
    const crowded = {
      ...entry.features,
      regions: [Float64Array.from({ length: 9 }, (_, i) => i), ...entry.features.regions.slice(1)],
    };
    expect(codeOf(() => decodeFeatures(encodeFeatures(crowded), schema, 'history'))).toBe('bytes-broken');
    expect(
      codeOf(() => decodeFeatures(encodeFeatures({ ...entry.features, slots: [4, 2] }), schema, 'history')),
    ).toBe('bytes-broken');
  });
});
