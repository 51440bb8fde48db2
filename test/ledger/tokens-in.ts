import { decodeCounts } from '../../src/model/codec-counts.ts';
import { decodeEntries } from '../../src/model/codec-entries.ts';
import { decodeTable } from '../../src/model/codec-table.ts';
import { schema } from './fixture.ts';

/** Tokens of a packed object: inside it they are differences of variable length, which no search for bytes finds. */
export function tokensIn(key: string, body: Uint8Array): number[] {
  if (key.startsWith('model/bases/')) return [...decodeCounts(body, schema, key).regions[0].tokens];
  if (key.startsWith('model/tables/')) {
    const table = decodeTable(body, schema, key);
    const { groups, excess } = table.bursts;
    return [
      ...table.counts.regions[0].tokens,
      ...table.pruned.flatMap((p) => [...p]),
      ...excess.regions[0].tokens,
      ...groups.flatMap((g) => g.regions.flatMap((tokens) => [...tokens])),
    ];
  }
  if (key.startsWith('model/segments/'))
    return decodeEntries(body, schema, key).flatMap(({ features }) => [...features.regions[0]]);
  return [];
}
