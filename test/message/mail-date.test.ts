import { describe, expect, test } from 'vitest';
import { readMailDate } from '../../src/message/mail-date.ts';

describe('readMailDate', () => {
  const valid: [value: string, time: number][] = [
    ['Tue, 3 Mar 2026 10:15:00 +0100', Date.UTC(2026, 2, 3, 9, 15)],
    ['3 Mar 2026 10:15 +0000', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 03 Mar 2026 10:15:00 -0930', Date.UTC(2026, 2, 3, 19, 45)],
    ['tue, 3 mar 2026 10:15:00 gmt', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 3 March 2026 10:15:00 Z', Date.UTC(2026, 2, 3, 10, 15)],
    // RFC 5322 section 4.3: EST is -0500, EDT -0400; unknown names count as -0000.
    ['Tue, 3 Mar 2026 10:15:00 EST', Date.UTC(2026, 2, 3, 15, 15)],
    ['Tue, 3 Mar 2026 10:15:00 EDT', Date.UTC(2026, 2, 3, 14, 15)],
    ['Tue, 3 Mar 2026 10:15:00 K', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 3 Mar 26 10:15:00 +0000', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 3 Mar 70 10:15:00 +0000', Date.UTC(1970, 2, 3, 10, 15)],
    ['Sat, 3 Mar 126 10:15:00 +0000', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 3 Mar 2026 23:59:60 +0000', Date.UTC(2026, 2, 3, 23, 59, 59)],
    ['Tue, 3 Mar 2026 10:15:00 (a (nested) comment) +0000', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 3 Mar 2026 10:15:00', Date.UTC(2026, 2, 3, 10, 15)],
    ['Tue, 29 Feb 2028 00:00:00 +0000', Date.UTC(2028, 1, 29)],
    ['3-Mar-2026 10:15:00 GMT+01:00', Date.UTC(2026, 2, 3, 9, 15)],
  ];
  test.each(valid)('%s', (value, time) => {
    expect(readMailDate(value)).toBe(time);
  });

  const invalid = [
    '',
    'yesterday',
    'Tue, 31 Feb 2026 10:15:00 +0000',
    'Tue, 29 Feb 2026 00:00:00 +0000',
    'Tue, 0 Mar 2026 10:15:00 +0000',
    'Tue, 3 Foo 2026 10:15:00 +0000',
    'Tue, 3 Mar 2026 24:15:00 +0000',
    'Tue, 3 Mar 2026 10:60:00 +0000',
    'Tue, 3 Mar 2026 10:15:61 +0000',
    'Tue, 3 Mar 2026',
    '2026-03-03T10:15:00Z',
    '03/03/2026 10:15',
    '('.repeat(1000),
    'Tue, 3 Mar 1600 10:15:00 +0000',
  ];
  test.each(invalid)('%j is no date', (value) => {
    expect(readMailDate(value)).toBeNull();
  });
});
