import { readDesk } from '../../../src/desk/read-desk.ts';
import { createExtractor } from '../../../src/features/extractor.ts';
import type { Features } from '../../../src/features/schema.ts';
import { parseForm } from '../../../src/message/form.ts';
import { parseMail } from '../../../src/message/mail.ts';
import { defaultFit } from '../../../src/model/fit.ts';
import { fitTable } from '../../../src/model/fit-table.ts';
import { emptyCounts, epochAt, foldEntries } from '../../../src/model/fold.ts';
import { posteriorOf } from '../../../src/model/posterior-of.ts';
import { createScorer, type Scorer } from '../../../src/model/scorer.ts';
import { serve } from '../../../src/model/served-table.ts';
import { deskJson } from '../../scenario/desk.ts';
import type { Language } from '../../scenario/people.ts';
import { generateScenario } from '../../scenario/scenario.ts';

/** How a desk of one language and a desk of all languages do on the same later letters of that language. */
export interface LanguageRow {
  readonly language: Language;
  readonly learned: number;
  readonly scored: number;
  readonly rightAlone: number;
  readonly rightMixed: number;
}

interface Letter {
  readonly language: Language;
  readonly features: Features;
  readonly queue: string;
  readonly epoch: number;
}

/** Splits a scenario's letters by language as if each had a desk of its own. The earlier 70 % are learned with their true queues,
 *  the rest scored; the mixed desk learns all languages' together. Letters of machines are left out. */
export async function compareDesks(seed: number, messages: number): Promise<LanguageRow[]> {
  const scenario = generateScenario(seed, { messages });
  const desk = readDesk(deskJson(scenario), 'desk.json');
  const queues = desk.queues.map((queue) => queue.id);
  const { schema, extract } = createExtractor(desk, new Uint8Array(16).fill(11));
  const letters: Letter[] = [];
  for (const { contentType, bytes, trueQueue, arrivesAtMs, language } of scenario.messages) {
    if (language === null) continue;
    const message = contentType === 'application/json' ? parseForm(bytes) : await parseMail(bytes);
    letters.push({ language, features: extract(message), queue: trueQueue, epoch: epochAt(arrivesAtMs) });
  }
  const scorerOf = (learned: readonly Letter[]): Scorer => {
    const entries = learned.map(({ features, queue, epoch }) => ({
      features,
      said: null,
      minus: null,
      plus: { queue, epoch },
    }));
    const counts = foldEntries(emptyCounts(schema), entries);
    const fit = fitTable(counts, learned, defaultFit(schema));
    return createScorer(serve(counts, fit, { halfLifeDays: null }), [], queues, null);
  };
  const right = (scorer: Scorer, asked: readonly Letter[]) =>
    asked.filter(({ features, queue }) => {
      const { probability } = posteriorOf(scorer, features);
      return queues[probability.indexOf(Math.max(...probability))] === queue;
    }).length;
  const languages = [...new Set(letters.map(({ language }) => language))].sort();
  const split = languages.map((language) => {
    const all = letters.filter((letter) => letter.language === language);
    const at = Math.floor(all.length * 0.7);
    return { language, learned: all.slice(0, at), asked: all.slice(at) };
  });
  const mixed = scorerOf(split.flatMap(({ learned }) => learned));
  return split.map(({ language, learned, asked }) => ({
    language,
    learned: learned.length,
    scored: asked.length,
    rightAlone: right(scorerOf(learned), asked),
    rightMixed: right(mixed, asked),
  }));
}
