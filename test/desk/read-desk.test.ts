import { describe, expect, it } from 'vitest';
import { DeskError } from '../../src/desk/desk-problem.ts';
import { readDesk } from '../../src/desk/read-desk.ts';
import { TallypostError } from '../../src/errors.ts';

type Json = Record<string, unknown>;

const small = {
  version: 1,
  name: 'Fenmark Water',
  queues: [
    { id: 'billing', title: 'Bills' },
    { id: 'leaks', title: 'Leaks', wrongRouteMinutes: 30 },
  ],
  costs: { lookMinutes: 2, wrongRouteMinutes: 12 },
} as const;

const bytes = (value: unknown) =>
  new TextEncoder().encode(typeof value === 'string' ? value : JSON.stringify(value));
const read = (value: unknown) => readDesk(bytes(value), 'config/desk.json');

function faultsOf(value: unknown): string[] {
  try {
    read(value);
  } catch (error) {
    if (error instanceof DeskError)
      return error.problems.map((each) => `${each.place}: ${each.expected}; got ${each.got}`);
    throw error;
  }
  throw new Error('was read without a fault');
}

describe('a valid desk file', () => {
  it('gets its defaults, and queues the common cost of a wrong route', () => {
    expect(read(small)).toEqual({
      version: 1,
      name: 'Fenmark Water',
      timeZone: 'UTC',
      ownAddresses: [],
      ownDomains: [],
      queues: [
        { id: 'billing', title: 'Bills', wrongRouteMinutes: 12 },
        { id: 'leaks', title: 'Leaks', wrongRouteMinutes: 30 },
      ],
      costs: { lookMinutes: 2, wrongRouteMinutes: 12 },
      senderClasses: [],
      references: [],
      forms: [],
      fields: [],
      guards: [],
      auditShare: 0,
      halfLifeDays: null,
    });
  });

  it('may name its schema, begin with a byte order mark, and holds addresses and domains as messages do', () => {
    const desk = read(
      `\ufeff${JSON.stringify({
        $schema: './desk.schema.json',
        ...small,
        ownAddresses: ['Help@Fenmark.EXAMPLE'],
        ownDomains: ['Wässer.example'],
        senderClasses: [{ id: 'council', domains: ['Council.Example'] }],
        guards: [{ id: 'vip', queue: 'leaks', senders: ['Chair@Council.example', '@Gov.Example'] }],
      })}`,
    );
    expect(desk).not.toHaveProperty('$schema');
    expect(desk.ownAddresses).toEqual(['help@fenmark.example']);
    expect(desk.ownDomains).toEqual(['xn--wsser-gra.example']); // RFC 3492 of "wässer"
    expect(desk.senderClasses).toEqual([{ id: 'council', domains: ['council.example'] }]);
    expect(desk.guards[0]).toEqual({
      id: 'vip',
      queue: 'leaks',
      phrases: [],
      senders: ['chair@council.example', '@gov.example'],
      fields: [],
    });
  });
});

describe('a desk file with one fault says where, expected and got', () => {
  const at = 'config/desk.json#';
  const guard = { id: 'danger', queue: 'leaks', phrases: ['gas smell'] };
  it.each<[string, Json, string]>([
    ['not an object', [] as unknown as Json, `${at}: an object; got a list of 0`],
    [
      'no version',
      { version: undefined },
      `${at}/version: 1, the version of this file’s format; got nothing`,
    ],
    ['a later version', { version: 2 }, `${at}/version: 1, the version of this file’s format; got 2`],
    ['no name', { name: undefined }, `${at}/name: a string; got nothing`],
    ['a blank name', { name: ' ' }, `${at}/name: a name, not blank; got " "`],
    ['an unknown member', { queue: [] }, `${at}/queue: no member of this name; got "queue"`],
    [
      'an unknown member that needs escaping',
      { 'a/b~': 1 },
      `${at}/a~1b~0: no member of this name; got "a/b~"`,
    ],
    ['no queues', { queues: [] }, `${at}/queues: at least one queue; got a list of 0`],
    [
      'a queue id in capitals',
      { queues: [{ id: 'Billing', title: 'x' }] },
      `${at}/queues/0/id: a queue id: 1 to 63 of a-z, 0-9 and -, beginning with a letter or digit; got "Billing"`,
    ],
    [
      'a queue id of 64 letters',
      { queues: [{ id: 'q'.repeat(64), title: 'x' }] },
      `${at}/queues/0/id: a queue id: 1 to 63 of a-z, 0-9 and -, beginning with a letter or digit; got "${'q'.repeat(58)}…`,
    ],
    [
      'two queues of one id',
      { queues: [small.queues[0], small.queues[0]] },
      `${at}/queues/1/id: no repetition of /queues/0/id; got "billing"`,
    ],
    [
      'a queue without a title',
      { queues: [{ id: 'billing' }] },
      `${at}/queues/0/title: a string; got nothing`,
    ],
    [
      'a negative cost',
      { costs: { lookMinutes: -1, wrongRouteMinutes: 12 } },
      `${at}/costs/lookMinutes: minutes, at least 0; got -1`,
    ],
    [
      'a cost in words',
      { costs: { lookMinutes: 'two', wrongRouteMinutes: 12 } },
      `${at}/costs/lookMinutes: minutes, a number of at most 100000; got "two"`,
    ],
    [
      'an absurd cost',
      { costs: { lookMinutes: 2, wrongRouteMinutes: 1e6 } },
      `${at}/costs/wrongRouteMinutes: minutes, at most 100000; got 1000000`,
    ],
    [
      'a missing cost',
      { costs: { lookMinutes: 2 } },
      `${at}/costs/wrongRouteMinutes: minutes, a number of at most 100000; got nothing`,
    ],
    [
      'no such time zone',
      { timeZone: 'Fenmark/Lowtown' },
      `${at}/timeZone: an IANA time zone such as Europe/London; got "Fenmark/Lowtown"`,
    ],
    [
      'an address without @',
      { ownAddresses: ['help'] },
      `${at}/ownAddresses/0: an e-mail address such as help@desk.example; got "help"`,
    ],
    [
      'one address twice, in other case',
      { ownAddresses: ['a@b.example', 'A@b.example'] },
      `${at}/ownAddresses/1: no repetition of /ownAddresses/0; got "a@b.example"`,
    ],
    [
      'a domain with a scheme',
      { ownDomains: ['https://b.example'] },
      `${at}/ownDomains/0: a domain such as desk.example; got "https://b.example"`,
    ],
    [
      'a reserved sender class',
      { senderClasses: [{ id: 'own', domains: [] }] },
      `${at}/senderClasses/0/id: none of missing, other, own: they are always there; got "own"`,
    ],
    [
      'a reference without a wildcard',
      { references: [{ id: 'account', pattern: 'FW' }] },
      `${at}/references/0/pattern: printable ASCII with at least one # or @, no space at either end; got "FW"`,
    ],
    [
      'two references of one id',
      {
        references: [
          { id: 'a', pattern: '#' },
          { id: 'a', pattern: '##' },
        ],
      },
      `${at}/references/1/id: no repetition of /references/0/id; got "a"`,
    ],
    [
      'a form called missing',
      { forms: ['missing'] },
      `${at}/forms/0: none of missing, other: they are always there; got "missing"`,
    ],
    [
      'a field of an undeclared form',
      { fields: [{ form: 'contact', field: 'topic', values: ['x'] }] },
      `${at}/fields/0/form: one of \`forms\`; got "contact"`,
    ],
    [
      'a field declared twice',
      {
        forms: ['c'],
        fields: [
          { form: 'c', field: 'f', values: ['x'] },
          { form: 'c', field: 'f', values: ['y'] },
        ],
      },
      `${at}/fields/1: no repetition of /fields/0; got "[\\"c\\",\\"f\\"]"`,
    ],
    [
      'a field without choices',
      { forms: ['c'], fields: [{ form: 'c', field: 'f', values: [] }] },
      `${at}/fields/0/values: at least one choice; got a list of 0`,
    ],
    [
      'two choices that differ by case only',
      { forms: ['c'], fields: [{ form: 'c', field: 'f', values: ['Leak', 'leak '] }] },
      `${at}/fields/0/values/1: no repetition of /fields/0/values/0; got "leak"`,
    ],
    [
      'a choice called Other',
      { forms: ['c'], fields: [{ form: 'c', field: 'f', values: ['Other'] }] },
      `${at}/fields/0/values/0: none of missing, other: they are always there; got "other"`,
    ],
    [
      'a guard to no queue',
      { guards: [{ ...guard, queue: 'safety' }] },
      `${at}/guards/0/queue: the id of a queue of this file; got "safety"`,
    ],
    [
      'a guard for nothing',
      { guards: [{ id: 'danger', queue: 'leaks' }] },
      `${at}/guards/0: at least one phrase, sender or field; got none`,
    ],
    [
      'a guard phrase without a word',
      { guards: [{ ...guard, phrases: ['!!!'] }] },
      `${at}/guards/0/phrases/0: at least one letter or digit; got "!!!"`,
    ],
    [
      'two guards of one id',
      { guards: [guard, guard] },
      `${at}/guards/1/id: no repetition of /guards/0/id; got "danger"`,
    ],
    [
      'a guard sender without @',
      { guards: [{ ...guard, senders: ['b.example'] }] },
      `${at}/guards/0/senders/0: an address such as a@b.example, or a domain such as @b.example; got "b.example"`,
    ],
    [
      'a guard on an undeclared form',
      { guards: [{ ...guard, fields: [{ form: 'x', field: 'y', values: ['z'] }] }] },
      `${at}/guards/0/fields/0/form: one of \`forms\`; got "x"`,
    ],
    ['an audit share above 1', { auditShare: 5 }, `${at}/auditShare: at most 1; got 5`],
    ['a half-life of nothing', { halfLifeDays: 0 }, `${at}/halfLifeDays: at least 1 day; got 0`],
    [
      'a half-life in words',
      { halfLifeDays: 'a year' },
      `${at}/halfLifeDays: days above 0, or null; got "a year"`,
    ],
  ])('%s', (_title, change, expected) => {
    expect(faultsOf(Array.isArray(change) ? change : { ...small, ...change })).toEqual([expected]);
  });
});

describe('a desk file with several faults', () => {
  it('lists each of them', () => {
    const broken = { ...small, name: 3, costs: { lookMinutes: -1 }, extra: 1, more: 2 };
    expect(faultsOf(broken)).toEqual([
      'config/desk.json#/name: a string; got 3',
      'config/desk.json#/costs/lookMinutes: minutes, at least 0; got -1',
      'config/desk.json#/costs/wrongRouteMinutes: minutes, a number of at most 100000; got nothing',
      'config/desk.json#/extra: no member of this name; got "extra"',
      'config/desk.json#/more: no member of this name; got "more"',
    ]);
    expect(() => read(broken)).toThrow(
      'desk-invalid at config/desk.json: expected a valid desk file, got 5 problems:\n  /name: expected a string, got 3\n  /costs/lookMinutes:',
    );
  });

  it('lists the rules between members once the members are right', () => {
    const broken = {
      ...small,
      timeZone: 'Nowhere',
      guards: [{ id: 'danger', queue: 'safety', phrases: ['x', '?'] }],
    };
    expect(faultsOf(broken).map((each) => each.split(':')[0])).toEqual([
      'config/desk.json#/timeZone',
      'config/desk.json#/guards/0/queue',
      'config/desk.json#/guards/0/phrases/1',
    ]);
  });
});

describe('a file that is not JSON', () => {
  it.each([
    ['an empty file', '', 'an empty file'],
    ['a trailing comma', '{\n  "version": 1,\n}', 'a syntax error in line 3, column 1'],
    ['bytes that are not UTF-8', Uint8Array.of(0x22, 0xff, 0x22), 'bytes that are not UTF-8'],
  ])('%s', (_title, file, got) => {
    const json = typeof file === 'string' ? bytes(file) : file;
    expect(() => readDesk(json, 'desk.json')).toThrow(
      `desk-not-json at desk.json: expected JSON in UTF-8, got ${got}`,
    );
  });

  it('above 1 MB is not even parsed', () => {
    expect(() => readDesk(new Uint8Array(1024 * 1024 + 1), 'desk.json')).toThrow(
      'desk-too-large at desk.json: expected at most 1048576 bytes, got 1048577 bytes',
    );
  });

  it('is an error of our own', () => {
    expect(() => read('{')).toThrow(TallypostError);
  });
});
