import { englishLexicon, englishShared } from './english-shared.ts';
import { campaignTopics, englishTopics, visitTopics } from './english-topics.ts';
import { germanLexicon, germanShared, germanTopics } from './german.ts';
import type { Lexicon } from './grammar.ts';
import { commonLexicon, type Language } from './people.ts';
import { polishLexicon, polishShared, polishTopics } from './polish.ts';
import type { SharedLanguage, Topic } from './topic.ts';
import { urgentTopics } from './urgent-topics.ts';

export interface LanguageBook {
  readonly topics: readonly Topic[];
  readonly shared: SharedLanguage;
  readonly lexicon: Lexicon;
}

export const languages: Readonly<Record<Language, LanguageBook>> = {
  english: {
    topics: [...englishTopics, ...urgentTopics],
    shared: englishShared,
    lexicon: { ...commonLexicon, ...englishLexicon },
  },
  polish: { topics: polishTopics, shared: polishShared, lexicon: { ...commonLexicon, ...polishLexicon } },
  german: { topics: germanTopics, shared: germanShared, lexicon: { ...commonLexicon, ...germanLexicon } },
};

/** The English letters of a time: the exchange of meters brings some, requests for visits come towards the end. */
export function englishBook(isCampaign: boolean, isVisiting: boolean): LanguageBook {
  const topics = [
    ...languages.english.topics,
    ...(isCampaign ? campaignTopics : []),
    ...(isVisiting ? visitTopics : []),
  ];
  return { ...languages.english, topics };
}
