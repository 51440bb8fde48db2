import { addTypos, writeSentence } from './grammar.ts';
import type { LanguageBook } from './languages.ts';
import type { Person } from './people.ts';
import type { Chance } from './random.ts';
import type { QueueId, Topic } from './topic.ts';

/** What somebody wrote, before it becomes mail or a form. */
export interface Letter {
  readonly person: Person;
  readonly topic: Topic;
  readonly queue: QueueId;
  readonly subject: string;
  readonly greeting: string;
  readonly paragraphs: readonly string[];
  readonly closing: string;
  readonly isShort: boolean;
}

/** How often letters hold what makes them hard; tuned so that plain multinomial counts reach about nine in ten. */
export const difficulty = {
  shortShare: 0.03,
  shortSubjectShare: 0.6,
  sharedSubjectShare: 0.15,
  secondCoreShare: 0.6,
  asideShare: 0.08,
  typingShare: 0.25,
  typosPerWord: 0.03,
} as const;

export function writeLetter(
  person: Person,
  topic: Topic,
  queue: QueueId,
  book: LanguageBook,
  chance: Chance,
): Letter {
  const { shared } = book;
  // The sender's mail address is not where they live.
  const { address: _, ...given } = person;
  const say = (template: string) => capitalised(writeSentence(template, book.lexicon, given, chance));
  const isShort = chance.isTrue(difficulty.shortShare);
  const hasOwnSubject = isShort
    ? chance.isTrue(difficulty.shortSubjectShare)
    : !chance.isTrue(difficulty.sharedSubjectShare);
  const subject = say(chance.pick(hasOwnSubject ? topic.subjects : shared.subjects));
  const paragraphs = isShort ? [say(chance.pick(shared.short))] : body(topic, book, say, chance);
  const slips = chance.isTrue(difficulty.typingShare) ? difficulty.typosPerWord : 0;
  return {
    person,
    topic,
    queue,
    subject,
    greeting: isShort && chance.isTrue(0.6) ? '' : say(chance.pick(shared.greetings)),
    paragraphs: paragraphs.map((text) => (slips > 0 ? addTypos(text, slips, chance) : text)),
    closing: say(chance.pick(shared.closings)),
    isShort,
  };
}

function body(topic: Topic, book: LanguageBook, say: (template: string) => string, chance: Chance): string[] {
  const { shared } = book;
  const first: string[] = [];
  if (chance.isTrue(0.5)) first.push(say(chance.pick(shared.openers)));
  const cores = chance.sample(topic.core, chance.isTrue(difficulty.secondCoreShare) ? 2 : 1);
  first.push(...cores.map(say));
  const second = [
    ...chance.sample(topic.more, 1 + chance.below(3)),
    ...chance.sample(shared.context, chance.below(3)),
    ...chance.sample(shared.chatter, chance.isTrue(0.25) ? 1 : 0),
  ];
  const third = chance.sample(shared.asks, chance.below(2));
  const parts = [first, chance.sample(second, second.length).map(say), third.map(say)];
  if (chance.isTrue(difficulty.asideShare)) {
    const other = chance.pick(book.topics.filter((each) => each.weight > 1));
    const aside = say(chance.pick(chance.isTrue(0.6) ? other.core : other.more));
    (parts[chance.below(2) + 1] as string[]).push(joined(chance.pick(shared.asides), aside));
  }
  return parts.filter((sentences) => sentences.length > 0).map((sentences) => sentences.join(' '));
}

/** Lower case after a comma, but never the `I` of English or a German noun's neighbour we cannot tell. */
function joined(lead: string, sentence: string): string {
  return (
    lead +
    (/^(The|There|We|You|Our|My|Your|Please|Is|It) /.test(sentence) && lead.endsWith(', ')
      ? (sentence[0] as string).toLowerCase() + sentence.slice(1)
      : sentence)
  );
}

function capitalised(text: string): string {
  return text === '' ? text : (text[0] as string).toUpperCase() + text.slice(1);
}
