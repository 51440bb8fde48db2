import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { type Column, type Counts, type Entry, epochMs, type RegionCounts } from './counts.ts';
import { recordBands, recordSaid } from './record.ts';
import { addArrays, addRegions, emptyRegion, remapRegion, type Shortfall } from './sparse.ts';

/** The UTC week of a confirmation, counted from 1970-01-01. */
export function epochAt(ms: number): number {
  return Math.floor(ms / epochMs);
}

/** Nothing learned yet. */
export function emptyCounts(schema: Schema): Counts {
  return {
    schema,
    columns: [],
    messages: new Float64Array(0),
    slots: schema.slots.map(() => new Float64Array(0)),
    regions: schema.regions.map(() => emptyRegion(0)),
    record: new Float64Array(recordBands * 4),
  };
}

/** The counts with every entry's `minus` taken out and its `plus` put in. Gives a new value; `counts` stays as it is.
 *  Addition is exact on integers, so the result is the same for any order and any batching of the entries, byte for byte.
 *  Cost: O(cells + incidences · log incidences).
 *  Throws TallypostError `schema-mismatch` for features of another schema, `counts-negative` when something would be taken
 *  out that is not there. */
export function foldEntries(counts: Counts, entries: readonly Entry[]): Counts {
  let folded = counts;
  for (let from = 0; from < entries.length; from += bounds.foldEntriesMax) {
    folded = addCounts(
      folded,
      deltaOf(counts.schema, entries.slice(from, from + bounds.foldEntriesMax), exactly),
      'refuse',
    );
  }
  return folded;
}

/** Both tables' counts together: commutative and associative, with the empty table as its neutral element. */
export function mergeCounts(a: Counts, b: Counts): Counts {
  return addCounts(a, b, 'refuse');
}

/** The counts with queues renamed; queues that get the same name are merged by addition. Names not in the map stay. */
export function renameQueues(counts: Counts, to: ReadonlyMap<string, string>): Counts {
  const renamed = counts.columns.map((c) => ({ queue: to.get(c.queue) ?? c.queue, epoch: c.epoch }));
  return remapCounts(counts, renamed, new Float64Array(renamed.length).fill(1));
}

/** The counts with column c turned into `target[c]` (null drops it) and multiplied by `weight[c]`; what meets is added. */
export function remapCounts(
  counts: Counts,
  target: readonly (Column | null)[],
  weight: Float64Array,
): Counts {
  const columns = unionOf(
    target.filter((c, i) => c !== null && counts.messages[i] * weight[i] > 0) as Column[],
    [],
  );
  const index = indexOf(columns);
  const to = target.map((c) => (c === null ? -1 : (index.get(nameOf(c)) ?? -1)));
  const messages = new Float64Array(columns.length);
  for (let c = 0; c < to.length; c++) if (to[c] >= 0) messages[to[c]] += counts.messages[c] * weight[c];
  return {
    schema: counts.schema,
    columns,
    messages,
    slots: counts.slots.map((d, j) =>
      remapSlot(d, counts.schema.slots[j].values.length, to, weight, columns.length),
    ),
    regions: counts.regions.map((r) => remapRegion(r, to, weight, columns.length)),
    record: counts.record,
  };
}

/** How an entry's column is counted: as it stands, with weight 1, or projected. */
export type Placing = (column: Column) => { readonly column: Column; readonly weight: number };

export const exactly: Placing = (column) => ({ column, weight: 1 });

/** The change that the entries make: a table whose cells may be negative. At most `foldEntriesMax` entries. */
export function deltaOf(schema: Schema, entries: readonly Entry[], place: Placing): Counts {
  const changes: { entry: Entry; column: Column; weight: number }[] = [];
  const record = new Float64Array(recordBands * 4);
  for (const entry of entries) {
    if (entry.features.schema !== schema.id) throw schemaMismatch('entry', schema.id, entry.features.schema);
    for (const [sign, side] of [
      [-1, entry.minus],
      [1, entry.plus],
    ] as const) {
      if (side === null) continue;
      const placed = place(side);
      changes.push({ entry, column: placed.column, weight: sign * placed.weight });
      if (entry.said) recordSaid(record, entry.said, side.queue, sign);
    }
  }
  const columns = unionOf(
    changes.map((c) => c.column),
    [],
  );
  const index = indexOf(columns);
  const at = changes.map((c) => index.get(nameOf(c.column)) as number);
  const messages = new Float64Array(columns.length);
  const slots = schema.slots.map((slot) => new Float64Array(slot.values.length * columns.length));
  changes.forEach(({ entry, weight }, i) => {
    messages[at[i]] += weight;
    entry.features.slots.forEach((value, j) => {
      slots[j][value * columns.length + at[i]] += weight;
    });
  });
  const regions = schema.regions.map((_, g) =>
    regionDelta(
      changes.map(({ entry, weight }, i) => ({ tokens: entry.features.regions[g], column: at[i], weight })),
      columns.length,
    ),
  );
  return { schema, columns, messages, slots, regions, record };
}

/** Sums (token, column, weight) triples into sorted sparse rows. Token and column are packed into one double, exact below
 *  2^53 since tokens stay below 2^40 and a batch touches at most 2 · foldEntriesMax = 2^13 columns; the engine sorts
 *  plain doubles several times faster than it sorts by a comparison function. */
function regionDelta(
  changes: readonly { readonly tokens: Float64Array; readonly column: number; readonly weight: number }[],
  columns: number,
): RegionCounts {
  const total = new Float64Array(columns);
  const byWeight = new Map<number, { readonly tokens: Float64Array; readonly column: number }[]>();
  for (const change of changes) {
    total[change.column] += change.weight * change.tokens.length;
    const same = byWeight.get(change.weight);
    if (same) same.push(change);
    else byWeight.set(change.weight, [change]);
  }
  let sum = emptyRegion(columns);
  for (const [weight, same] of byWeight) {
    const keys = new Float64Array(same.reduce((n, c) => n + c.tokens.length, 0));
    let n = 0;
    for (const { tokens, column } of same) for (const token of tokens) keys[n++] = token * columns + column;
    sum = addRegions(sum, runsOf(keys.sort(), weight, columns), 'keep', 'change');
  }
  return { ...sum, total };
}

/** Sorted keys, each run of equal ones a cell of `weight` times its length. */
function runsOf(keys: Float64Array, weight: number, columns: number): RegionCounts {
  const tokens = new Float64Array(keys.length);
  const start = new Uint32Array(keys.length + 1);
  const column = new Uint32Array(keys.length);
  const count = new Float64Array(keys.length);
  let held = 0;
  let cells = 0;
  for (let i = 0; i < keys.length; ) {
    let end = i + 1;
    while (end < keys.length && keys[end] === keys[i]) end++;
    const token = Math.floor(keys[i] / columns);
    if (held === 0 || tokens[held - 1] !== token) tokens[held++] = token;
    column[cells] = keys[i] - token * columns;
    count[cells++] = weight * (end - i);
    start[held] = cells;
    i = end;
  }
  return {
    tokens: tokens.slice(0, held),
    start: start.slice(0, held + 1),
    column: column.slice(0, cells),
    count: count.slice(0, cells),
    total: new Float64Array(columns),
  };
}

/** a + b over the union of their columns; columns left without messages are dropped. */
export function addCounts(a: Counts, b: Counts, shortfall: Shortfall): Counts {
  if (a.schema.id !== b.schema.id) throw schemaMismatch('table', a.schema.id, b.schema.id);
  const columns = unionOf(a.columns, b.columns);
  const left = widen(a, columns);
  const right = widen(b, columns);
  const sum: Counts = {
    schema: a.schema,
    columns,
    messages: addArrays(left.messages, right.messages, shortfall, 'messages'),
    slots: left.slots.map((d, j) => addArrays(d, right.slots[j], shortfall, `slot ${a.schema.slots[j].id}`)),
    regions: left.regions.map((r, g) =>
      addRegions(r, right.regions[g], shortfall, `region ${a.schema.regions[g].id}`),
    ),
    record: addArrays(a.record, b.record, shortfall, 'record'),
  };
  return sum.messages.includes(0) ? withoutEmptyColumns(sum, shortfall) : sum;
}

/** A column whose last message was taken out must be empty altogether; otherwise something was taken out of the wrong one. */
function withoutEmptyColumns(counts: Counts, shortfall: Shortfall): Counts {
  if (shortfall === 'refuse') {
    counts.messages.forEach((c, k) => {
      if (c === 0 && counts.regions.some((r) => r.total[k] !== 0 || r.column.includes(k))) {
        const place = nameOf(counts.columns[k]);
        throw new TallypostError({
          code: 'counts-broken',
          place: `column ${place}`,
          expected: 'no counts, since no message is left',
          got: 'some',
        });
      }
    });
  }
  return remapCounts(counts, counts.columns, new Float64Array(counts.columns.length).fill(1));
}

function widen(counts: Counts, columns: readonly Column[]): Counts {
  const index = indexOf(columns);
  const to = counts.columns.map((c) => index.get(nameOf(c)) as number);
  if (columns.length === to.length && to.every((c, i) => c === i)) return counts;
  const ones = new Float64Array(to.length).fill(1);
  const messages = new Float64Array(columns.length);
  for (let c = 0; c < to.length; c++) messages[to[c]] = counts.messages[c];
  return {
    ...counts,
    columns,
    messages,
    slots: counts.slots.map((d, j) =>
      remapSlot(d, counts.schema.slots[j].values.length, to, ones, columns.length),
    ),
    regions: counts.regions.map((r) => remapRegion(r, to, ones, columns.length)),
  };
}

function remapSlot(
  d: Float64Array,
  values: number,
  to: ArrayLike<number>,
  weight: ArrayLike<number>,
  after: number,
): Float64Array {
  const before = to.length;
  const moved = new Float64Array(values * after);
  for (let v = 0; v < values; v++) {
    for (let c = 0; c < before; c++)
      if (to[c] >= 0) moved[v * after + to[c]] += d[v * before + c] * weight[c];
  }
  return moved;
}

export function nameOf(column: Column): string {
  return `${column.queue}@${column.epoch}`;
}

/** Null stands for no column. */
export function isSameColumn(a: Column | null, b: Column | null): boolean {
  return a === b || (a !== null && b !== null && a.queue === b.queue && a.epoch === b.epoch);
}

/** Distinct columns of both lists, ascending by queue (UTF-16 code units), then epoch. */
export function unionOf(a: readonly Column[], b: readonly Column[]): Column[] {
  const distinct = new Map<string, Column>();
  for (const list of [a, b])
    for (const c of list) distinct.set(nameOf(c), { queue: c.queue, epoch: c.epoch });
  return [...distinct.values()].sort((x, y) =>
    x.queue < y.queue ? -1 : x.queue > y.queue ? 1 : x.epoch - y.epoch,
  );
}

export function indexOf(columns: readonly Column[]): Map<string, number> {
  return new Map(columns.map((c, i) => [nameOf(c), i]));
}

export function schemaMismatch(place: string, expected: string, got: string): TallypostError {
  return new TallypostError({
    code: 'schema-mismatch',
    place,
    expected: `schema ${expected}`,
    got: `schema ${got}`,
  });
}
