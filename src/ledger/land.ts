import { bounds } from '../bounds.ts';
import type { Fault } from '../errors.ts';
import type { Schema } from '../features/schema.ts';
import { decodeFeatures, encodeEntries } from '../model/codec-entries.ts';
import type { Entry } from '../model/counts.ts';
import { isSameColumn } from '../model/fold.ts';
import { keys } from '../store/keys.ts';
import { createAbsorbedReader, type HasAbsorbed } from './absorbed.ts';
import { commit, readManifest } from './commit.ts';
import { lastSegmentOf, type Settled, type Stored, settle } from './history.ts';
import { editHistory, historyKey, type ReadHistory, readHistory } from './history-store.ts';
import { newId } from './ids.ts';
import { landingOf, openAmong } from './landing.ts';
import { ageMs, checkSchema, isNamed, type Manifest, withSegment, withVoided } from './manifest.ts';
import { putNew } from './objects.ts';
import { faultOf, isLasting, isOfStore, mapBounded, pause } from './pace.ts';
import { type Answer, type Plan, plan, type Request } from './plan.ts';
import type { World } from './world.ts';

/** All that is to be done to one message's history. */
export interface Work {
  readonly message: string;
  readonly requests: readonly Request[];
}

export type Landing =
  /** One answer a request; everything that they say is in the counts. */
  | { readonly kind: 'landed'; readonly answers: readonly Answer[] }
  /** Not known to be in the counts. */
  | { readonly kind: 'unknown'; readonly fault: Fault };

export interface LandOptions {
  /** A claim that another process folds is left to it for this long before it is taken over. */
  readonly patienceMs: number;
  /** Refuses a request in the light of the manifest read; null: fine. */
  readonly refuse?: (request: Request, manifest: Manifest) => Fault | null;
}

/** Brings changes of histories into the counts, exactly once each: histories, then one segment, then the manifest. Rounds repeat
 *  with a new segment whenever another process voided this one's. One landing a work, in order; messages are distinct. */
export async function land(
  world: World,
  schema: Schema,
  works: readonly Work[],
  options: LandOptions,
): Promise<Landing[]> {
  const landings = new Map<Work, Landing>();
  const own = new Set<string>();
  for (let round = 0; round < bounds.foldRoundsMax; round++) {
    const open = works.filter((work) => landings.get(work)?.kind !== 'landed');
    if (open.length === 0) break;
    if (round > 0) await pause(world, round);
    let outcomes: Landing[];
    let isFinal = false;
    try {
      outcomes = await new Round(world, schema, options, own).run(open);
    } catch (error) {
      isFinal = !isOfStore(error);
      outcomes = open.map(() => ({ kind: 'unknown', fault: faultOf(error, keys.manifest) }));
    }
    outcomes.forEach((landing, i) => {
      landings.set(open[i], landing);
    });
    if (isFinal || outcomes.every(isHopeless)) break;
  }
  return works.map((work) => landings.get(work) as Landing);
}

/** Faults that another round at once would meet again. */
const lastingFaults = new Set(['being-folded', 'object-damaged', 'schema-mismatch', 'invariant-broken']);

function isHopeless(landing: Landing): boolean {
  return landing.kind === 'landed' || lastingFaults.has(landing.fault.code) || isLasting(landing.fault);
}

interface Opened {
  readonly work: Work;
  readonly read: ReadHistory;
}

/** One attempt with one segment. */
class Round {
  readonly #world: World;
  readonly #schema: Schema;
  readonly #options: LandOptions;
  /** Segments of this process's earlier rounds: nobody else waits for them. */
  readonly #own: Set<string>;
  readonly #absorbedOf: (manifest: Manifest) => Promise<HasAbsorbed>;
  readonly #landings = new Map<Work, Landing>();
  readonly #planned = new Map<Work, Plan>();
  #segment = '';
  /** Why nothing of this round can land; null: it can. */
  #abandonedFor: Fault | null = null;

  constructor(world: World, schema: Schema, options: LandOptions, own: Set<string>) {
    this.#world = world;
    this.#schema = schema;
    this.#options = options;
    this.#own = own;
    this.#absorbedOf = createAbsorbedReader(world);
  }

  async run(works: readonly Work[]): Promise<Landing[]> {
    const { manifest: first } = await readManifest(this.#world);
    checkSchema(first, this.#schema);
    const opened = await this.#open(works);
    const { manifest, ready } = await this.#voidOthers(opened, first);
    const hasAbsorbed = await this.#absorbedFor(ready, manifest);
    this.#segment = newId(this.#world, manifest.floor, manifest.atMs);
    this.#own.add(this.#segment);
    await mapBounded(ready, (one) => this.#write(one, manifest, hasAbsorbed));
    if (this.#abandonedFor === null && this.#planned.size > 0) await this.#commit(first.version);
    return works.map(
      (work) =>
        this.#landings.get(work) ?? {
          kind: 'unknown',
          fault: this.#abandonedFor ?? {
            code: 'contended',
            place: historyKey(work.message),
            expected: 'a turn to fold',
            got: 'none',
          },
        },
    );
  }

  async #open(works: readonly Work[]): Promise<Opened[]> {
    const opened = await mapBounded(works, async (work): Promise<Opened | null> => {
      try {
        return { work, read: await readHistory(this.#world, work.message) };
      } catch (error) {
        this.#fail(work, faultOf(error, historyKey(work.message)));
        return null;
      }
    });
    return opened.filter((one) => one !== null);
  }

  /** Reads the list of absorbed segments only when a history names a segment that is not beside the base; null: none does. */
  async #absorbedFor(opened: readonly Opened[], manifest: Manifest): Promise<HasAbsorbed | null> {
    const lasts = opened.flatMap(({ read }) => lastSegmentOf(read.stored) ?? []);
    return lasts.some((id) => !isNamed(manifest, id)) ? this.#absorbedOf(manifest) : null;
  }

  /** Takes the right to land from every segment that stands in the way: void before takeover. What turns out to have landed
   *  stays landed. Young segments of others are left alone, and their messages with them. */
  async #voidOthers(
    opened: readonly Opened[],
    first: Manifest,
  ): Promise<{ manifest: Manifest; ready: Opened[] }> {
    const hasAbsorbed = await this.#absorbedFor(opened, first);
    const inTheWay = new Set<string>();
    const ready = opened.filter(({ work, read }) => {
      const blocking = settle(read.stored, first, hasAbsorbed, null).open?.segment;
      if (blocking === undefined) return true;
      const isYoung = Math.abs(ageMs(blocking, this.#world.nowMs())) < this.#options.patienceMs;
      if (isYoung && !this.#own.has(blocking)) {
        const got = 'another process';
        this.#fail(work, {
          code: 'being-folded',
          place: historyKey(work.message),
          expected: 'nobody at it',
          got,
        });
        return false;
      }
      inTheWay.add(blocking);
      return true;
    });
    if (inTheWay.size === 0) return { manifest: first, ready };
    const voided = await commit(this.#world, async (manifest) => {
      const absorbed = await this.#absorbedOf(manifest);
      const open = openAmong(inTheWay, manifest, absorbed);
      if (open.length === 0) return { kind: 'settled', value: null };
      return { kind: 'write', next: withVoided(manifest, this.#world.nowMs(), open), value: null };
    });
    if (voided.kind === 'known') return { manifest: voided.manifest, ready };
    for (const { work } of ready) this.#fail(work, voided.fault);
    return { manifest: first, ready: [] };
  }

  async #write({ work, read }: Opened, manifest: Manifest, hasAbsorbed: HasAbsorbed | null): Promise<void> {
    if (this.#abandonedFor !== null) return;
    try {
      const edited = await editHistory(this.#world, work.message, read, (stored) => {
        // Open also where another wrote it since and only the list of absorbed segments tells: the next round reads it.
        const settled = settle(stored, manifest, hasAbsorbed, this.#segment);
        if (settled.open) return { next: null, value: null };
        const planned = this.#plan(work, stored, settled, manifest);
        return { next: planned.next, value: planned };
      });
      // Whether the history names the segment is not known: committing it could count the message without its
      // entry, or the entry without its message.
      if (edited.kind === 'unknown') this.#abandonedFor ??= edited.fault;
      else if (edited.value?.move) this.#planned.set(work, edited.value);
      else if (edited.value) this.#landings.set(work, { kind: 'landed', answers: edited.value.answers });
    } catch (error) {
      this.#fail(work, faultOf(error, historyKey(work.message)));
    }
  }

  #plan(work: Work, stored: Stored | null, settled: Settled, manifest: Manifest): Plan {
    const faults = work.requests.map((r) => this.#options.refuse?.(r, manifest) ?? null);
    const admitted = work.requests.filter((_, i) => faults[i] === null);
    const { next, move, answers } =
      admitted.length > 0
        ? plan(work.message, stored, settled, admitted, this.#segment, this.#schema.id)
        : { next: null, move: null, answers: [] };
    if (move && !isSameColumn(move.minus, move.plus))
      decodeFeatures(move.encoded, this.#schema, historyKey(work.message));
    const rest = [...answers];
    return {
      next,
      move,
      answers: faults.map((fault) => (fault ? { kind: 'refused', fault } : (rest.shift() as Answer))),
    };
  }

  async #commit(readAtVersion: number): Promise<void> {
    const id = this.#segment;
    const planned = [...this.#planned];
    const entries = planned.flatMap(([work, { move }]): Entry[] => {
      const { encoded, said, minus, plus } = move as NonNullable<Plan['move']>;
      if (isSameColumn(minus, plus)) return [];
      return [
        { features: decodeFeatures(encoded, this.#schema, historyKey(work.message)), said, minus, plus },
      ];
    });
    await putNew(this.#world, keys.segments + id, encodeEntries(this.#schema, entries));
    const erases = planned.some(([, { move }]) => move?.erases);
    const committed = await commit<boolean>(this.#world, async (manifest, hasTried) => {
      const hasAbsorbed = hasTried ? await this.#absorbedOf(manifest) : null;
      const landing = landingOf(manifest, id, readAtVersion, hasAbsorbed);
      if (landing !== 'free') return { kind: 'settled', value: landing === 'landed' };
      checkSchema(manifest, this.#schema);
      const next = withSegment(manifest, this.#world.nowMs(), id, this.#schema.id, erases);
      return { kind: 'write', next, value: true };
    });
    if (committed.kind === 'unknown') this.#abandonedFor = committed.fault;
    else if (committed.value)
      for (const [work, { answers }] of planned) this.#landings.set(work, { kind: 'landed', answers });
  }

  #fail(work: Work, fault: Fault): void {
    this.#landings.set(work, { kind: 'unknown', fault });
  }
}
