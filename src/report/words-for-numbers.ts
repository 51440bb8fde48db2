/** Numbers as a reader meets them. */

/** 0.932 as `93 in 100`; near the ends with one place more, so that 99.6 does not read as all. */
export function inHundred(share: number): string {
  const hundred = share * 100;
  if (hundred > 99.95 && hundred < 100) return 'over 99.9 in 100';
  const isNearEnd = hundred > 0 && hundred < 100 && (hundred > 99 || hundred < 1);
  return `${isNearEnd ? hundred.toFixed(1) : Math.round(hundred)} in 100`;
}

export function percent(share: number): string {
  const hundred = share * 100;
  // A no-break space, so that the sign never begins a line.
  return `${hundred > 99 && hundred < 100 ? hundred.toFixed(1) : Math.round(hundred)}\u00a0%`;
}

export function count(value: number): string {
  return Math.round(value).toLocaleString('en-GB');
}

export function plural(value: number, one: string, many = `${one}s`): string {
  return `${count(value)} ${Math.round(value) === 1 ? one : many}`;
}

/** Minutes as hours where that reads better. */
export function minutes(value: number): string {
  if (value < 1) return 'under a minute';
  return value < 100 ? plural(value, 'minute') : plural(value / 60, 'hour');
}

export function size(bytes: number): string {
  if (bytes < 1024) return plural(bytes, 'byte');
  return bytes < 1024 ** 2 ? `${Math.round(bytes / 1024)} KB` : `${(bytes / 1024 ** 2).toFixed(1)} MB`;
}

/** `4 May 2026`. */
export function day(iso: string): string {
  return new Intl.DateTimeFormat('en-GB', {
    day: 'numeric',
    month: 'long',
    year: 'numeric',
    timeZone: 'UTC',
  }).format(new Date(iso));
}

/** `4 May`. */
export function shortDay(iso: string): string {
  return new Intl.DateTimeFormat('en-GB', { day: 'numeric', month: 'short', timeZone: 'UTC' }).format(
    new Date(iso),
  );
}

/** How long ago, in the largest unit that is at least one. */
export function ago(iso: string, nowIso: string): string {
  const hours = (Date.parse(nowIso) - Date.parse(iso)) / 3_600_000;
  if (hours < 1) return 'less than an hour';
  return hours < 48 ? plural(Math.floor(hours), 'hour') : plural(Math.floor(hours / 24), 'day');
}

/** `a, b and c`. */
export function listed(words: readonly string[]): string {
  if (words.length < 2) return words.join('');
  return `${words.slice(0, -1).join(', ')} and ${words.at(-1)}`;
}
