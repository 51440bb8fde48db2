import type { Letter } from './letter.ts';
import type { Chance } from './random.ts';
import type { QueueId } from './topic.ts';

type Fields = Record<string, string>;

/** Forms that are made for one matter, and how often somebody with that matter finds them. */
const special: Readonly<Partial<Record<QueueId, { form: string; share: number }>>> = {
  'meter-readings': { form: 'meter-reading', share: 0.55 },
  'moving-home': { form: 'move', share: 0.55 },
  'leaks-and-bursts': { form: 'leak', share: 0.5 },
  'sewer-flooding': { form: 'leak', share: 0.2 },
  'water-quality': { form: 'leak', share: 0.12 },
  billing: { form: 'meter-reading', share: 0.04 },
  careers: { form: 'vacancy', share: 0.6 },
};

const choiceOf: Readonly<Record<QueueId, string>> = {
  billing: 'bill',
  'meter-readings': 'meter',
  'moving-home': 'moving',
  'leaks-and-bursts': 'water',
  'water-quality': 'water',
  'sewer-flooding': 'drains',
  'new-connections': 'something else',
  complaints: 'something else',
  careers: 'something else',
  suppliers: 'something else',
};
const choices = ['bill', 'meter', 'moving', 'water', 'drains', 'something else'] as const;

/** A letter as a submitted form: JSON bytes. */
export function formOf(letter: Letter, atMs: number, chance: Chance): Uint8Array {
  const { person, queue } = letter;
  const found = special[queue];
  const form = found !== undefined && chance.isTrue(found.share) ? found.form : 'contact';
  const text = letter.paragraphs.join('\n\n');
  const fields: Fields = { name: person.name, ...(chance.isTrue(0.7) ? { account: person.account } : {}) };
  Object.assign(fields, fieldsOf(form, letter, text, chance));
  const at = new Date(atMs - 1000 * chance.below(20)).toISOString();
  return Buffer.from(JSON.stringify({ form, at, from: person.address, fields }));
}

function fieldsOf(form: string, letter: Letter, text: string, chance: Chance): Fields {
  const { person, topic } = letter;
  switch (form) {
    case 'meter-reading':
      return {
        kind: chance.weighted({ regular: 8, first: 1, final: 1 }),
        reading: String(10_000 + chance.below(80_000)),
        note: text,
      };
    case 'move': {
      const direction = topic.id === 'moving-in' ? 'in' : topic.id === 'moving-out' ? 'out' : 'both';
      return { direction: chance.isTrue(0.85) ? direction : 'both', address: person.street, note: text };
    }
    case 'leak': {
      const where = /street|coming/.test(topic.id)
        ? 'road'
        : chance.pick(['garden', 'inside', 'road', 'meter box']);
      return {
        where,
        urgent: chance.isTrue(0.45) ? 'yes' : 'no',
        place: `${person.street}, ${person.town}`,
        what: text,
      };
    }
    case 'vacancy':
      return { vacancy: letter.subject, letter: text };
    default: {
      const isRight = chance.isTrue(0.68);
      const choice = isRight ? choiceOf[letter.queue] : chance.pick(choices);
      return { topic: choice, ...(chance.isTrue(0.4) ? { subject: letter.subject } : {}), message: text };
    }
  }
}
