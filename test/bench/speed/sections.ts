import bayes from 'bayes';
import { MultinomialNB } from 'ml-naivebayes';
import { decide } from '../../../src/decision/decide.ts';
import { readDesk } from '../../../src/desk/read-desk.ts';
import { createExtractor } from '../../../src/features/extractor.ts';
import { decideMessage } from '../../../src/handlers/route-object.ts';
import { joinMetadata, metadataOf } from '../../../src/handlers/routing-metadata.ts';
import { parseForm } from '../../../src/message/form.ts';
import { parseMail } from '../../../src/message/mail.ts';
import { encodeCounts } from '../../../src/model/codec-counts.ts';
import { decodeTable, encodeTable } from '../../../src/model/codec-table.ts';
import type { Counts } from '../../../src/model/counts.ts';
import { defaultFit } from '../../../src/model/fit.ts';
import { fitTable } from '../../../src/model/fit-table.ts';
import { emptyCounts, epochAt, foldEntries } from '../../../src/model/fold.ts';
import { posteriorOf } from '../../../src/model/posterior-of.ts';
import { createScorer, type Scorer } from '../../../src/model/scorer.ts';
import { serve } from '../../../src/model/served-table.ts';
import { deskJson } from '../../scenario/desk.ts';
import { generateScenario, type ScenarioMessage } from '../../scenario/scenario.ts';
import { cellsOf, countsOf, createGenerated, entryOf, type Generated, ordinary } from './generated.ts';
import { type Row, sideBySide } from './measure.ts';

/** The steps of a route on the scenario's mails of 3 to 5 KB, as they are. */
export async function routeSection(rounds: number): Promise<Row[]> {
  const scenario = generateScenario(7, { messages: 1500 });
  const desk = readDesk(deskJson(scenario), 'desk.json');
  const tokenKey = new Uint8Array(16).fill(7);
  const extractor = createExtractor(desk, tokenKey);
  const parse = ({ contentType, bytes }: ScenarioMessage) =>
    contentType === 'application/json' ? parseForm(bytes) : parseMail(bytes);
  const learned = [];
  for (const message of scenario.messages) {
    const said = message.confirmations.at(-1);
    if (said === undefined) continue;
    const features = extractor.extract(await parse(message));
    learned.push({ features, queue: said.queue as string, epoch: epochAt(said.atMs) });
  }
  const entries = learned.map(({ features, ...plus }) => ({ features, said: null, minus: null, plus }));
  const counts = foldEntries(emptyCounts(extractor.schema), entries);
  const fit = fitTable(counts, learned, defaultFit(extractor.schema));
  const table = serve(counts, fit, { halfLifeDays: null });
  const queues = desk.queues.map((queue) => queue.id);
  const scorer = createScorer(table, [], queues, null);
  const mails = generateScenario(8, { messages: 4000 })
    .messages.filter(({ contentType, bytes }) => contentType !== 'application/json' && bytes.length > 3000)
    .filter(({ bytes }) => bytes.length < 5200)
    .slice(0, 60);
  const meanBytes = mails.reduce((sum, { bytes }) => sum + bytes.length, 0) / mails.length;
  const parsed = await Promise.all(mails.map(({ bytes }) => parseMail(bytes)));
  const features = parsed.map((message) => extractor.extract(message));
  const posteriors = features.map((each) => posteriorOf(scorer, each));
  const bench = { desk, extractor, model: { version: 1, scorer, isEmpty: false, fault: null } };
  const pieces = mails.length;
  const tokens = features.reduce((sum, f) => sum + f.regions.reduce((n, r) => n + r.length, 0), 0) / pieces;
  const cases = [
    {
      what: 'parse',
      pieces,
      note: `${pieces} mails of ${Math.round(meanBytes)} bytes`,
      run: async () => {
        for (const { bytes } of mails) await parseMail(bytes);
      },
    },
    {
      what: 'features',
      pieces,
      note: `${Math.round(tokens)} tokens a mail`,
      run: () => parsed.map((message) => extractor.extract(message)),
    },
    {
      what: 'score',
      pieces,
      note: `${queues.length} queues, ${learned.length} confirmed messages`,
      run: () => features.map((each) => posteriorOf(scorer, each)),
    },
    {
      what: 'decide',
      pieces,
      note: 'guards and costs',
      run: () =>
        parsed.map((message, i) =>
          decide({ posterior: posteriors[i], message, desk, modelKnows: true, draw: 0.5 }),
        ),
    },
    {
      what: 'parse, features',
      pieces,
      note: 'of texts just parsed',
      run: async () => {
        for (const { bytes } of mails) extractor.extract(await parseMail(bytes));
      },
    },
    {
      what: 'parse, features, score',
      pieces,
      note: '',
      run: async () => {
        for (const { bytes } of mails) posteriorOf(scorer, extractor.extract(await parseMail(bytes)));
      },
    },
    {
      what: 'whole route',
      pieces,
      note: 'all of it and the metadata, no store',
      run: async () => {
        for (const { bytes, key } of mails) {
          const { decision, posterior } = decideMessage({ tokenKey }, bench, key, await parseMail(bytes));
          const context = { modelVersion: 1, schema: extractor.schema.id, atMs: 0, trace: '' };
          joinMetadata({}, metadataOf(decision, posterior, context), key);
        }
      },
    },
  ];
  return sideBySide(cases, rounds, 'parse');
}

/** 300 tokens in each of four regions, 20 queues; the libraries learn and score the very same tokens. The dense one needs a
 *  column a token, so that the vocabulary is kept small: it has to fit. */
export async function scoringSection(rounds: number): Promise<Row[]> {
  const generated = createGenerated({
    queues: 20,
    tokens: [300, 300, 300, 300],
    vocabularies: [2000, 2000, 2000, 2000],
    ownWords: 150,
    messages: 400,
    weeks: 8,
  });
  const learned = Array.from({ length: 400 }, (_, i) => generated.message(i));
  const asked = Array.from({ length: 20 }, (_, i) => generated.message(400 + i));
  const scorer = scorerOf(generated, countsOf(generated, 400));
  const names = ({ features }: (typeof learned)[number]) =>
    features.regions.flatMap((region, g) => Array.from(region, (token) => `${g}:${token.toString(16)}`));
  const library = bayes({ tokenizer: (tokens) => tokens });
  for (const message of learned) await library.learn(names(message), message.queue);
  const columns = new Map<string, number>();
  for (const message of learned)
    for (const name of names(message)) columns.set(name, columns.get(name) ?? columns.size);
  const dense = (message: (typeof learned)[number]) => {
    const row = new Array<number>(columns.size).fill(0);
    for (const name of names(message)) {
      const column = columns.get(name);
      if (column !== undefined) row[column] = 1;
    }
    return row;
  };
  const matrix = new MultinomialNB();
  const present = generated.queues.filter((queue) => learned.some((message) => message.queue === queue));
  matrix.train(
    learned.map(dense),
    learned.map((message) => present.indexOf(message.queue)),
  );
  const [askedNames, askedRows] = [asked.map(names), asked.map(dense)];
  const share = async (answer: (i: number) => Promise<string> | string) => {
    let right = 0;
    for (const [i, { queue }] of asked.entries()) if ((await answer(i)) === queue) right += 1;
    return `${right} of ${asked.length} right`;
  };
  const best = (i: number) => {
    const { probability } = posteriorOf(scorer, asked[i].features);
    return generated.queues[probability.indexOf(Math.max(...probability))];
  };
  const pieces = asked.length;
  const cases = [
    {
      what: 'tallypost',
      pieces,
      note: await share(best),
      run: () => asked.map(({ features }) => posteriorOf(scorer, features)),
    },
    {
      what: 'bayes 1.0.0',
      pieces,
      note: await share((i) => library.categorize(askedNames[i])),
      run: async () => {
        for (const tokens of askedNames) await library.categorize(tokens);
      },
    },
    {
      what: 'ml-naivebayes 4.0.0',
      pieces,
      note: `${await share((i) => present[matrix.predict([askedRows[i]])[0]])}, ${columns.size} dense columns`,
      run: () => askedRows.map((row) => matrix.predict([row])),
    },
  ];
  return sideBySide(cases, rounds, 'tallypost');
}

function scorerOf(generated: Generated, counts: Counts): Scorer {
  const table = serve(counts, defaultFit(generated.schema), { halfLifeDays: null });
  return createScorer(table, [], generated.queues, null);
}

/** Loading a table, folding a batch of 100 and scoring, at three numbers of queues; 5,000 confirmed messages each. */
export async function queuesSection(rounds: number): Promise<Row[]> {
  const rows: Row[] = [];
  for (const queues of [2, 20, 200]) {
    const generated = createGenerated({ ...ordinary, queues, messages: 5000, weeks: 26 });
    const counts = countsOf(generated, 5000);
    const fit = fitTable(
      counts,
      Array.from({ length: 1000 }, (_, i) => {
        const { features, queue, atMs } = generated.message(i * 5);
        return { features, queue, epoch: epochAt(atMs) };
      }),
      defaultFit(generated.schema),
    );
    const table = serve(counts, fit, { halfLifeDays: null });
    const [served, base] = [encodeTable(table), encodeCounts(counts)];
    const scorer = createScorer(table, [], generated.queues, null);
    const asked = Array.from({ length: 50 }, (_, i) => generated.message(5000 + i).features);
    const batch = Array.from({ length: 100 }, (_, i) => entryOf(generated, 5000 + i));
    const perCell = (bytes: Uint8Array, of: Counts) => (bytes.length / cellsOf(of)).toFixed(2);
    rows.push(
      ...(await sideBySide(
        [
          {
            what: `${queues} queues: table load`,
            pieces: 1,
            note: `${(served.length / 1e6).toFixed(2)} MB, ${perCell(served, table.counts)} bytes a cell; base ${perCell(base, counts)}`,
            run: () =>
              createScorer(decodeTable(served, generated.schema, 'table'), [], generated.queues, null),
          },
          {
            what: `${queues} queues: fold of a batch of 100`,
            pieces: 1,
            note: 'into counts of their own',
            run: () => foldEntries(emptyCounts(generated.schema), batch),
          },
          {
            what: `${queues} queues: overlay of a batch of 100`,
            pieces: 1,
            note: `on ${cellsOf(table.counts)} cells`,
            run: () => createScorer(table, batch, generated.queues, null),
          },
          {
            what: `${queues} queues: score`,
            pieces: asked.length,
            note: '300 tokens a message',
            run: () => asked.map((features) => posteriorOf(scorer, features)),
          },
        ],
        rounds,
      )),
    );
  }
  return rows;
}
