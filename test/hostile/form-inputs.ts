import { Buffer } from 'node:buffer';
import { form, type HostileInput, padding, plea } from './hostile-input.ts';

const unreadable = (name: string, build: () => Buffer): HostileInput => ({
  name,
  channel: 'form',
  build,
  defects: ['form-unreadable'],
  expectedDecision: 'unreadable',
});

const contact = (fields: Record<string, unknown>, more: Record<string, unknown> = {}) =>
  form({ form: 'contact', at: '2026-03-03T10:15:00Z', ...more, fields });

/** Forms: anyone can post anything. */
export const formInputs: readonly HostileInput[] = [
  unreadable('a form of no bytes', () => Buffer.alloc(0)),
  unreadable('a form that is no JSON', () => Buffer.from(`form=contact&message=${plea}`)),
  unreadable('a form that breaks off', () => contact({ message: plea }).subarray(0, 60)),
  unreadable('a form that is a list', () => form([plea])),
  unreadable('a form that is nothing', () => form(null)),
  unreadable('a form in Latin-1', () =>
    Buffer.from('{"form":"contact","fields":{"message":"Z\xe4hler"}}', 'latin1'),
  ),
  unreadable('a form of 1.5 MB', () => contact({ message: 'x'.repeat(1_500_000) })),
  unreadable('400,000 brackets', () => Buffer.from('['.repeat(400_000))),
  {
    name: 'a form without fields',
    channel: 'form',
    build: () => form({ form: 'contact' }),
    defects: ['field-unreadable', 'text-missing'],
    expectedDecision: 'by-words',
  },
  {
    name: 'a form of 10,000 fields',
    channel: 'form',
    build: () =>
      contact({
        message: plea,
        ...Object.fromEntries(Array.from({ length: 10_000 }, (_, i) => [`f${i}`, 'x'])),
      }),
    defects: ['fields-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ form: f }) => (Object.keys(f!.fields).length === 200 ? null : 'number of fields'),
  },
  {
    name: 'a field of 900 KB',
    channel: 'form',
    build: () => contact({ message: `${plea} ${'water '.repeat(150_000)}` }),
    defects: ['field-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'a field name of 100 KB',
    channel: 'form',
    build: () => contact({ ['n'.repeat(100_000)]: 'x', message: plea }),
    defects: ['field-cut'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'form fields named like object members',
    channel: 'form',
    build: () =>
      Buffer.from(
        `{"form":"contact","fields":{"__proto__":"polluted","constructor":"x","toString":"y","message":${JSON.stringify(plea)}}}`,
      ),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ form: f }) =>
      Object.hasOwn(f!.fields, '__proto__') && ({} as Record<string, unknown>).polluted === undefined
        ? null
        : 'member lost',
  },
  {
    name: 'objects where text should be',
    channel: 'form',
    build: () =>
      contact({
        message: plea,
        topic: { toString: 'x' },
        list: [1, { a: 2 }],
        nothing: null,
        yes: true,
        number: 12,
      }),
    defects: ['field-unreadable'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ form: f }) => (f!.fields.yes === 'true' && f!.fields.number === '12' ? null : 'values lost'),
  },
  {
    name: 'two names that become one when cleaned',
    channel: 'form',
    build: () => contact({ topic: 'billing', 'to\u200bpic': 'leaks', message: plea }),
    defects: ['invisible-characters', 'field-unreadable'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ form: f }) => (f!.fields.topic === 'billing' ? null : 'first value replaced'),
  },
  {
    name: 'line breaks, NUL and overrides in a value',
    channel: 'form',
    build: () => contact({ message: `${plea}\r\nx-amz-meta-a: b\0 \u202e${padding}` }),
    defects: ['control-characters', 'direction-override'],
    keeps: plea,
    expectedDecision: 'by-words',
  },
  {
    name: 'half surrogates in a value',
    channel: 'form',
    build: () =>
      Buffer.from(`{"form":"contact","fields":{"message":${JSON.stringify(plea).slice(0, -1)} \\ud800"}}`),
    defects: [],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ text }) => (/\p{Surrogate}/u.test(text) ? 'half a pair kept' : null),
  },
  {
    name: 'a time, a sender and an id that are none',
    channel: 'form',
    build: () => form({ form: { a: 1 }, at: '2026-03-03', from: 'nobody', fields: { message: plea } }),
    defects: ['date-unreadable', 'address-unreadable', 'field-unreadable'],
    keeps: plea,
    expectedDecision: 'by-words',
    check: ({ sentAtMs, from }) => (sentAtMs === null && from === null ? null : 'made up'),
  },
];
