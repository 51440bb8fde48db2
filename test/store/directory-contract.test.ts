import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll } from 'vitest';
import { createDirectoryStore } from '../../src/store/directory.ts';
import { describeContract } from './contract.ts';

const directory = mkdtempSync(join(tmpdir(), 'tallypost-directory-'));
afterAll(() => rmSync(directory, { recursive: true, force: true }));

describeContract('directory', async () => ({
  store: createDirectoryStore(directory),
  again: () => createDirectoryStore(directory),
}));
