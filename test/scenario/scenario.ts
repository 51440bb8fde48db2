import {
  arrivals,
  campaign,
  crowdAt,
  dayMs,
  dayOf,
  newConnectionsOpenDay,
  startsAtMs,
  visitsFromDay,
} from './calendar.ts';
import { formOf } from './form.ts';
import { englishBook, type LanguageBook, languages } from './languages.ts';
import { writeLetter } from './letter.ts';
import { machineMail } from './machine-mail.ts';
import { mailOf } from './mail.ts';
import { inventPerson, type Language } from './people.ts';
import { type Chance, createChance } from './random.ts';
import { type QueueId, queueIds, type Topic } from './topic.ts';

export interface ScenarioConfirmation {
  readonly queue: QueueId;
  readonly by: string;
  readonly atMs: number;
}

export interface ScenarioMessage {
  /** Object key, `inbound/` included. */
  readonly key: string;
  readonly bytes: Uint8Array;
  readonly contentType: string;
  readonly arrivesAtMs: number;
  readonly trueQueue: QueueId;
  /** Of a person's letter; null: a machine wrote it. */
  readonly language: Language | null;
  /** In order of time: usually one; two when the first was wrong; none where nobody ever says. */
  readonly confirmations: readonly ScenarioConfirmation[];
}

export interface Scenario {
  readonly messages: readonly ScenarioMessage[];
  /** Queues that open after the start; before that the other queue gets their mail. */
  readonly openings: readonly { readonly queue: QueueId; readonly atMs: number; readonly before: QueueId }[];
  readonly campaign: { readonly fromMs: number; readonly toMs: number };
}

export const messagesDefault = 2400;

const shares = { form: 0.25, machine: 0.03, wrongConfirmation: 0.03, neverConfirmed: 0.02 } as const;
const staff = ['a.tolland', 'm.quill', 'j.osgodby', 's.penhale', 'd.farrow'] as const;

/** Queues that a person in a hurry takes for one another. */
const mistakenFor: Readonly<Partial<Record<QueueId, readonly QueueId[]>>> = {
  billing: ['meter-readings', 'moving-home', 'complaints'],
  'meter-readings': ['billing', 'leaks-and-bursts'],
  'moving-home': ['billing', 'meter-readings'],
  'leaks-and-bursts': ['sewer-flooding', 'water-quality'],
  'water-quality': ['leaks-and-bursts', 'complaints'],
  'sewer-flooding': ['leaks-and-bursts', 'complaints'],
};

/** 120 days at the desk of the invented Fenmark Water, from Monday 2026-01-05; the same for the same seed. */
export function generateScenario(seed: number, options: { readonly messages?: number } = {}): Scenario {
  const times = arrivals(options.messages ?? messagesDefault, createChance(seed));
  return {
    messages: times.map((atMs, i) => messageAt(atMs, createChance((seed + 1) * 7_368_787 + i * 104_729))),
    openings: [
      { queue: 'new-connections', atMs: startsAtMs + newConnectionsOpenDay * dayMs, before: 'moving-home' },
    ],
    campaign: { fromMs: startsAtMs + campaign.fromDay * dayMs, toMs: startsAtMs + campaign.toDay * dayMs },
  };
}

function messageAt(atMs: number, chance: Chance): ScenarioMessage {
  const person = inventPerson(chance.weighted<Language>({ english: 82, polish: 10, german: 8 }), chance);
  const stamp = new Date(atMs).toISOString().replace(/[-:]|\.\d+Z$/g, '');
  const id = `${stamp}-${chance.hex(8)}`;
  if (chance.isTrue(shares.machine)) {
    const { queue, bytes } = machineMail(person, atMs, chance);
    return {
      ...finished(`inbound/mail/${id}`, bytes, 'message/rfc822', atMs, queue, chance),
      language: null,
    };
  }
  const book = bookAt(person.language, dayOf(atMs));
  const { topic, queue } = topicAt(book, dayOf(atMs), chance);
  const letter = writeLetter(person, topic, queue, book, chance);
  const isForm = queue !== 'suppliers' && chance.isTrue(shares.form);
  const bytes = isForm ? formOf(letter, atMs, chance) : mailOf(letter, book, atMs, chance);
  const key = isForm ? `inbound/forms/${id}.json` : `inbound/mail/${id}`;
  const type = isForm ? 'application/json' : 'message/rfc822';
  const done = { ...finished(key, bytes, type, atMs, queue, chance), language: person.language };
  return topic.id === 'visit-request' ? { ...done, confirmations: [] } : done;
}

function bookAt(language: Language, day: number): LanguageBook {
  if (language !== 'english') return languages[language];
  return englishBook(day >= campaign.fromDay && day <= campaign.toDay, day >= visitsFromDay);
}

function topicAt(book: LanguageBook, day: number, chance: Chance): { topic: Topic; queue: QueueId } {
  const weights: Record<string, number> = {};
  book.topics.forEach((topic, i) => {
    for (const [queue, share] of Object.entries(topic.queues) as [QueueId, number][]) {
      weights[`${i} ${queue}`] = topic.weight * share * crowdAt(queue, day);
    }
  });
  const [index, queue] = chance.weighted(weights).split(' ') as [string, QueueId];
  const isOpen = queue !== 'new-connections' || day >= newConnectionsOpenDay;
  return { topic: book.topics[Number(index)] as Topic, queue: isOpen ? queue : 'moving-home' };
}

function finished(
  key: string,
  bytes: Uint8Array,
  contentType: string,
  arrivesAtMs: number,
  trueQueue: QueueId,
  chance: Chance,
): Omit<ScenarioMessage, 'language'> {
  return {
    key,
    bytes,
    contentType,
    arrivesAtMs,
    trueQueue,
    confirmations: confirmationsOf(arrivesAtMs, trueQueue, chance),
  };
}

/** Half are confirmed within five hours, one in twenty takes more than a day; a wrong one is corrected days later. */
function confirmationsOf(arrivesAtMs: number, queue: QueueId, chance: Chance): ScenarioConfirmation[] {
  if (chance.isTrue(shares.neverConfirmed)) return [];
  const delayMs = Math.min(8 * dayMs, Math.max(4 * 60_000, 5 * 3600_000 * Math.exp(1.1 * chance.normal())));
  const atMs = arrivesAtMs + Math.round(delayMs / 1000) * 1000;
  const by = chance.pick(staff);
  if (!chance.isTrue(shares.wrongConfirmation)) return [{ queue, by, atMs }];
  const open = queueIds.filter(
    (id) => id !== queue && (id !== 'new-connections' || dayOf(atMs) >= newConnectionsOpenDay),
  );
  const wrong = chance.pick(mistakenFor[queue] ?? open);
  const laterMs = dayMs * (1 + chance.below(11)) + 60_000 * chance.below(600);
  return [
    { queue: wrong, by, atMs },
    { queue, by: chance.pick(staff.filter((name) => name !== by)), atMs: atMs + laterMs },
  ];
}
