import { describe, expect, it } from 'vitest';
import * as z from 'zod/mini';
import { deskFile } from '../../src/desk/desk-file.ts';

describe('the JSON Schema for editors', () => {
  // Made by this test: `npx vitest run --config .config/vitest.config.ts test/desk --update` writes it anew.
  it('is what the reader checks by', async () => {
    const schema = { title: 'Desk file of Tallypost', ...z.toJSONSchema(deskFile, { io: 'input' }) };
    await expect(`${JSON.stringify(schema, null, 2)}\n`).toMatchFileSnapshot(
      '../../src/desk/desk.schema.json',
    );
  });
});
