import type { World } from './world.ts';

/** Ids of segments, bases, tables and orders: nine digits of time (base 36, ms), a dash, twelve random ones.
 *  They sort by time as strings, and are never reused: 62 random bits stand behind each millisecond. */
const timeDigits = 9;
const randomDigits = 12;

export const noId = '';

/** An id that sorts after `after`, even when this process's clock is behind the one that made it. */
export function newId(world: World, after: string, notBeforeMs = 0): string {
  const ms = Math.max(Math.floor(world.nowMs()), notBeforeMs, after === noId ? 0 : timeOf(after) + 1);
  let random = '';
  while (random.length < randomDigits) random += draw(world);
  return `${firstIdAt(ms)}-${random}`;
}

/** Sorts before every id made at or after `ms`. */
export function firstIdAt(ms: number): string {
  return Math.max(0, Math.floor(ms)).toString(36).padStart(timeDigits, '0');
}

export function laterOf(a: string, b: string): string {
  return [a, b].sort()[1];
}

export function timeOf(id: string): number {
  return Number.parseInt(id.slice(0, timeDigits), 36);
}

export function isId(value: unknown): value is string {
  return typeof value === 'string' && /^[0-9a-z]{9}-[0-9a-z]{12}$/.test(value);
}

/** Six digits: 31 bits, which every source of uniform numbers has. */
function draw(world: World): string {
  return Math.floor(world.random() * 36 ** 6)
    .toString(36)
    .padStart(6, '0');
}
