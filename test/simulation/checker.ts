import { decodeCounts } from '../../src/model/codec-counts.ts';
import { decodeEntries } from '../../src/model/codec-entries.ts';
import type { Column } from '../../src/model/counts.ts';
import { schema, tokenOf } from '../ledger/fixture.ts';
import { columnOf, type Oracle } from './oracle.ts';
import { SimulationError } from './scheduler.ts';
import type { Objects } from './simulated-store.ts';

interface StoredManifest {
  readonly version: number;
  readonly base: string | null;
  readonly table: string | null;
  readonly absorbed: string | null;
  readonly segments: readonly { readonly id: string }[];
  readonly rolledBack: readonly string[];
  readonly restores: readonly { readonly version: number; readonly to: number }[];
  readonly renames: Readonly<Record<string, { readonly to: string }>>;
}

interface StoredHistory {
  readonly erasedAt?: string;
  readonly placements?: readonly {
    readonly queue: string | null;
    readonly at: string;
    readonly segment: string;
  }[];
}

/** Message to column to count; columns as `queue@week`. */
type Table = Map<string, Map<string, number>>;

/** Looks at the objects themselves whenever the manifest was replaced. Reads with the model's codecs and none of the ledger. */
export class Checker {
  /** Messages by queue of today's names, by version: what a router of that version must hold. */
  readonly totals = new Map<number, Map<string, number>>();
  readonly #objects: Objects;
  readonly #oracle: Oracle;
  readonly #messages: readonly string[];
  readonly #messageOf: Map<number, string>;
  readonly #committedAt = new Map<number, number>();
  readonly #bases = new Map<string, Table>();
  readonly #segments = new Map<string, [string, string | null, string | null][]>();
  #version = 0;
  #restores = 0;

  constructor(objects: Objects, oracle: Oracle, messages: readonly string[]) {
    this.#objects = objects;
    this.#oracle = oracle;
    this.#messages = messages;
    this.#messageOf = new Map(messages.map((m) => [tokenOf(m), m]));
    this.totals.set(0, new Map());
    this.#committedAt.set(0, 0);
  }

  get version(): number {
    return this.#version;
  }

  /** Right after a new manifest: everything that must hold at any time. */
  check(): void {
    const manifest = this.#json<StoredManifest>('model/manifest.json');
    const at = this.#oracle.tick();
    if (manifest.version !== this.#version + 1) fail(`version ${manifest.version} follows ${this.#version}`);
    this.#version = manifest.version;
    this.#committedAt.set(manifest.version, at);
    for (const { to } of manifest.restores.slice(this.#restores))
      this.#oracle.restores.push({ at, toAt: this.#committedAt.get(to) as number });
    this.#restores = manifest.restores.length;
    const table = this.#tableOf(manifest);
    const landed = this.#landedIn(manifest);
    if (manifest.table !== null) this.#bytes(`model/tables/${manifest.table}`);
    const totals = new Map<string, number>();
    for (const message of this.#messages) {
      const column = standingIn(table, message, manifest.version);
      const allowed = this.#oracle.allowed(message);
      if (!allowed.has(column))
        fail(
          `version ${manifest.version}: ${message} stands under ${column}, allowed ${[...allowed].join(' or ')}`,
        );
      const told = this.#toldByHistory(message, landed, new Set(manifest.rolledBack));
      if (told !== column)
        fail(`version ${manifest.version}: ${message} stands under ${column}, its history says ${told}`);
      if (column === null) continue;
      const name = currentName(manifest, column.split('@')[0]);
      totals.set(name, (totals.get(name) ?? 0) + 1);
    }
    this.totals.set(manifest.version, totals);
  }

  /** Column of every message now. */
  standings(): Map<string, string> {
    if (this.#version === 0) return new Map();
    const manifest = this.#json<StoredManifest>('model/manifest.json');
    const table = this.#tableOf(manifest);
    const found = new Map<string, string>();
    for (const message of this.#messages) {
      const column = standingIn(table, message, manifest.version);
      if (column !== null) found.set(message, column);
    }
    return found;
  }

  #tableOf(manifest: StoredManifest): Table {
    const base = manifest.base === null ? new Map() : this.#base(manifest.base);
    const table: Table = new Map([...base].map(([m, columns]) => [m, new Map(columns)]));
    const add = (message: string, column: string | null, sign: number) => {
      if (column === null) return;
      const columns = table.get(message) ?? new Map<string, number>();
      columns.set(column, (columns.get(column) ?? 0) + sign);
      table.set(message, columns);
    };
    for (const { id } of manifest.segments)
      for (const [message, minus, plus] of this.#segment(id)) {
        add(message, minus, -1);
        add(message, plus, 1);
      }
    return table;
  }

  #base(id: string): Table {
    this.#bytes(`model/bases/${id}`);
    const held = this.#bases.get(id);
    if (held) return held;
    const counts = decodeCounts(this.#bytes(`model/bases/${id}`), schema, id);
    const [region] = counts.regions;
    const table: Table = new Map();
    region.tokens.forEach((token, row) => {
      const message = this.#messageOf.get(token);
      if (message === undefined) return;
      const columns = new Map<string, number>();
      for (let i = region.start[row]; i < region.start[row + 1]; i++)
        columns.set(nameOf(counts.columns[region.column[i]]) as string, region.count[i]);
      table.set(message, columns);
    });
    this.#bases.set(id, table);
    return table;
  }

  #segment(id: string): [string, string | null, string | null][] {
    this.#bytes(`model/segments/${id}`);
    const held = this.#segments.get(id);
    if (held) return held;
    const read = decodeEntries(this.#bytes(`model/segments/${id}`), schema, id).map(
      ({ features, minus, plus }): [string, string | null, string | null] => {
        const own = [...features.regions[0]].map((t) => this.#messageOf.get(t)).find((m) => m !== undefined);
        return [own as string, nameOf(minus), nameOf(plus)];
      },
    );
    this.#segments.set(id, read);
    return read;
  }

  #landedIn(manifest: StoredManifest): Set<string> {
    const landed = new Set(manifest.segments.map((s) => s.id));
    if (manifest.absorbed === null) return landed;
    const lines = new TextDecoder().decode(this.#bytes(`model/absorbed/${manifest.absorbed}`)).trim();
    for (const id of lines.split('\n')) landed.add(id);
    return landed;
  }

  /** The column of the last placement that landed and was not rolled back. */
  #toldByHistory(message: string, landed: Set<string>, dead: Set<string>): string | null {
    const key = `histories/${message}.json`;
    if (!this.#objects.held.has(key)) return null;
    const { placements = [] } = this.#json<StoredHistory>(key);
    const last = placements.findLast((p) => landed.has(p.segment) && !dead.has(p.segment));
    return last === undefined || last.queue === null ? null : columnOf({ queue: last.queue, at: last.at });
  }

  #bytes(key: string): Uint8Array {
    const held = this.#objects.held.get(key);
    if (!held) return fail(`the manifest names ${key}, which is not there`);
    return held.body;
  }

  #json<T>(key: string): T {
    return JSON.parse(new TextDecoder().decode(this.#bytes(key)));
  }
}

function standingIn(table: Table, message: string, version: number): string | null {
  const columns = [...(table.get(message) ?? [])].filter(([, count]) => count !== 0);
  if (columns.length === 0) return null;
  if (columns.length > 1 || columns[0][1] !== 1)
    fail(`version ${version}: ${message} counts as ${columns.map(([c, n]) => `${n} x ${c}`).join(', ')}`);
  return columns[0][0];
}

function currentName({ renames }: StoredManifest, queue: string): string {
  return Object.hasOwn(renames, queue)
    ? currentName({ renames } as StoredManifest, renames[queue].to)
    : queue;
}

function nameOf(column: Column | null): string | null {
  return column && `${column.queue}@${column.epoch}`;
}

export function fail(what: string): never {
  throw new SimulationError(what);
}
