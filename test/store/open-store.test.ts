import { existsSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { openStore } from '../../src/store/open-store.ts';
import { bytes } from './contract.ts';

const root = mkdtempSync(join(tmpdir(), 'tallypost-open-'));
afterAll(() => rmSync(root, { recursive: true, force: true }));

describe('a place', () => {
  it('that is a path opens a directory, made by the first write', async () => {
    const store = await openStore(join(root, 'a/b'));
    expect(store.place).toBe(join(root, 'a/b'));
    expect(existsSync(join(root, 'a'))).toBe(false);
    expect(await store.head('x')).toBeNull();
    await store.put('x', bytes('1'));
    expect(existsSync(join(root, 'a/b/.tallypost'))).toBe(true);
  });

  it.each([
    ['s3://desk-mail', 's3://desk-mail'],
    ['s3://desk-mail/', 's3://desk-mail'],
    ['s3://desk-mail/north/west', 's3://desk-mail/north/west'],
  ])('%s opens the bucket', async (place, expected) => {
    expect((await openStore(place)).place).toBe(expected);
  });

  it.each([
    ['s3://', 'an invalid bucket name'],
    ['s3://Desk/x', 'an invalid bucket name'],
    ['gs://desk', 'another scheme'],
    ['https://desk.example/x', 'another scheme'],
  ])('%s is refused', async (place, got) => {
    await expect(openStore(place)).rejects.toMatchObject({ code: 'place-refused', place, got });
  });
});
