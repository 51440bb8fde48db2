import { decide } from '../../decision/decide.ts';
import type { Decision } from '../../decision/decision.ts';
import type { Desk } from '../../desk/desk.ts';
import { TallypostError } from '../../errors.ts';
import { createExtractor } from '../../features/extractor.ts';
import type { Features } from '../../features/schema.ts';
import type { Message } from '../../message/message.ts';
import type { Said } from '../../model/counts.ts';
import { posteriorOf } from '../../model/posterior-of.ts';
import type { Scorer } from '../../model/scorer.ts';
import { createLearner, type Learner } from './learner.ts';
import { collectLabels, matchLabels, type QueueLabels } from './queue-labels.ts';
import { type HistoryAccount, openAccount, readHistory } from './read-history.ts';
import { deskOfQueues } from './replay-desk.ts';
import { createTally, type Tally } from './tally.ts';

export interface ReplayOptions {
  readonly learn: string;
  readonly score: string | null;
  readonly isProgressive: boolean;
  /** Null: a desk of the labels found. */
  readonly desk: Desk | null;
  /** False: keep the exponents that a desk starts with. */
  readonly isFitting: boolean;
  readonly nowMs: number;
  readonly onProgress: (done: number, total: number, what: string) => void;
}

interface Remembered {
  readonly queue: string | null;
  readonly atMs: number | null;
  readonly message: Message;
  readonly features: Features;
}

/** Share of a history that is scored when nothing else is given to score. */
const leftOutShare = 0.3;
/** Tokens of a replay meet no other desk's, so that their key need not be secret; fixed, a replay repeats itself. */
const replayKey = new Uint8Array(16);

/** Learns a labelled history and scores another, or the rest of it, or each message before it is folded. JSON-able.
 *  @throws TallypostError when a history cannot be read at all or holds no message. */
export async function replay(options: ReplayOptions) {
  const startedMs = performance.now();
  const spent = { readMs: 0, learnMs: 0, scoreMs: 0 };
  const collected = collectLabels();
  const labels: QueueLabels = options.desk === null ? collected : matchLabels(options.desk);
  const extractor = createExtractor(options.desk ?? deskOfQueues([{ id: 'any', title: 'any' }]), replayKey);
  const learnAccount = openAccount(options.learn);
  const queueOf = options.desk === null ? collected.learn : labels.queueOf;

  const learned: Remembered[] = [];
  for await (const each of timed(readHistory(learnAccount, options.nowMs), spent)) {
    const features = extractor.extract(each.message);
    learned.push({
      queue: queueOf(each.label),
      atMs: each.atMs,
      message: withoutText(each.message, options.desk),
      features,
    });
    if (learned.length % 100 === 0) options.onProgress(0, 0, `read ${learned.length} messages`);
  }
  const known = learned.filter((each) => each.queue !== null);
  if (known.length === 0)
    throw new TallypostError({
      code: 'history-empty',
      place: options.learn,
      expected: 'labelled messages of queues of this desk',
      got: `${learned.length} usable messages, none of such a queue; ${learnAccount.unusable} unusable ones`,
    });
  const desk = options.desk ?? deskOfQueues(labels.queues());
  const learner = createLearner(desk, extractor.schema, options.isFitting);
  const tally = createTally(desk);
  const common = { desk, learner, tally, spent, options };

  let split: { mode: string; note: string; scoreAccount?: HistoryAccount };
  if (options.isProgressive) split = progress(common, learned);
  else if (options.score !== null) split = await scoreOther(common, learned, labels, extractor.extract);
  else split = scoreRest(common, learned);

  const { note, mode, scoreAccount } = split;
  const table = learner.table();
  const perMessageMs =
    spent.readMs / Math.max(1, learnAccount.messages + (scoreAccount?.messages ?? 0)) +
    spent.scoreMs / Math.max(1, tally.count);
  return {
    mode,
    note,
    messages: tally.count,
    queues: desk.queues.length,
    ...tally.summary(),
    tableBytes: learner.tableBytes(),
    cells: table.counts.regions.reduce((sum, region) => sum + region.count.length, 0),
    /** From raw bytes to a decision, on one core, learning not included. */
    messagesPerSecond: 1000 / perMessageMs,
    peakRssBytes: process.resourceUsage().maxRSS * 1024,
    learned: learner.messages,
    scored: tally.count,
    histories: scoreAccount === undefined ? [learnAccount] : [learnAccount, scoreAccount],
    fit: table.fit,
    seconds: {
      read: spent.readMs / 1000,
      learn: spent.learnMs / 1000,
      score: spent.scoreMs / 1000,
      total: (performance.now() - startedMs) / 1000,
    },
  };
}

export type ReplayResult = Awaited<ReturnType<typeof replay>>;

interface Run {
  readonly desk: Desk;
  readonly learner: Learner;
  readonly tally: Tally;
  readonly spent: { readMs: number; learnMs: number; scoreMs: number };
  readonly options: ReplayOptions;
}

function scoreOne(run: Run, scorer: Scorer, each: Remembered): Decision {
  const startedMs = performance.now();
  const posterior = posteriorOf(scorer, each.features);
  const decision = decide({
    posterior,
    message: each.message,
    desk: run.desk,
    modelKnows: scorer.messages.some((count) => count > 0),
    // No look at random: a replay asks nobody.
    draw: 1,
  });
  run.tally.add(
    posterior,
    decision,
    run.desk.queues.some((queue) => queue.id === each.queue) ? each.queue : null,
  );
  run.spent.scoreMs += performance.now() - startedMs;
  return decision;
}

/** What the record of reliability takes from a decision: nothing from a guard's, which claims no probability. */
function saidBy(decision: Decision): Said | null {
  if (decision.kind === 'guarded' || decision.queue === null) return null;
  return { queue: decision.queue, posterior: decision.posterior, isAudit: false };
}

function learnAll(run: Run, messages: readonly Remembered[]): Scorer {
  const startedMs = performance.now();
  run.options.onProgress(0, 0, `learning ${messages.length} messages`);
  for (const each of messages)
    if (each.queue !== null) run.learner.fold(each.features, each.queue, dateOf(each), null);
  run.learner.compact();
  const scorer = run.learner.refresh();
  run.spent.learnMs += performance.now() - startedMs;
  return scorer;
}

async function scoreOther(
  run: Run,
  learned: readonly Remembered[],
  labels: QueueLabels,
  extract: (message: Message) => Features,
) {
  const scorer = learnAll(run, learned);
  const scoreAccount = openAccount(run.options.score!);
  for await (const each of timed(readHistory(scoreAccount, run.options.nowMs), run.spent)) {
    const startedMs = performance.now();
    const features = extract(each.message);
    run.spent.readMs += performance.now() - startedMs;
    scoreOne(run, scorer, { ...each, queue: labels.queueOf(each.label), features });
    if (run.tally.count % 100 === 0) run.options.onProgress(0, 0, `scored ${run.tally.count} messages`);
  }
  if (run.tally.count === 0)
    throw new TallypostError({
      code: 'history-empty',
      place: run.options.score!,
      expected: 'labelled messages to score',
      got: `none; ${scoreAccount.unusable} unusable ones`,
    });
  return { mode: 'learn one history, score another', note: '', scoreAccount };
}

/** Leaves the last part out: by time where every message has one, else the last part of each queue in the history's order. */
function scoreRest(run: Run, learned: readonly Remembered[]) {
  const isDated = learned.every((each) => each.atMs !== null);
  let first: Remembered[];
  let rest: Remembered[];
  if (isDated) {
    const ordered = inTime(learned);
    const cut = Math.ceil(ordered.length * (1 - leftOutShare));
    first = ordered.slice(0, cut);
    rest = ordered.slice(cut);
  } else {
    const total = new Map<string | null, number>();
    for (const { queue } of learned) total.set(queue, (total.get(queue) ?? 0) + 1);
    const seen = new Map<string | null, number>();
    const isFirst = ({ queue }: Remembered) => {
      const place = seen.get(queue) ?? 0;
      seen.set(queue, place + 1);
      return place < Math.ceil(total.get(queue)! * (1 - leftOutShare));
    };
    first = [];
    rest = [];
    for (const each of learned) (isFirst(each) ? first : rest).push(each);
  }
  const scorer = learnAll(run, first);
  for (const each of rest) scoreOne(run, scorer, each);
  const part = isDated ? 'the last 30 % in time' : 'the last 30 % of each queue in the order of the history';
  return { mode: 'learn the first part, score the rest', note: `left out and scored: ${part}` };
}

/** Folded messages wait for the next router to load the model: at most this share of what was learned. */
const waitingShareMax = 0.01;
/** A compaction whenever the learned messages grew by this factor: exponents move while there is little, and later fitting takes
 *  its time. */
const compactionGrowth = (messages: number) => (messages < 1000 ? 1.25 : 1.5);
const firstCompactionMessages = 40;

/** Predicts each message, then folds it. */
function progress(run: Run, learned: readonly Remembered[]) {
  const isDated = learned.every((each) => each.atMs !== null);
  const ordered = isDated ? inTime(learned) : spread(learned);
  const { learner } = run;
  let scorer = learner.refresh();
  let nextCompaction = firstCompactionMessages;
  let compactions = 0;
  ordered.forEach((each, index) => {
    const startedMs = performance.now();
    if (learner.messages >= nextCompaction) {
      learner.compact();
      compactions += 1;
      nextCompaction = Math.ceil(learner.messages * compactionGrowth(learner.messages));
      scorer = learner.refresh();
    } else if (learner.waiting > learner.messages * waitingShareMax) scorer = learner.refresh();
    run.spent.learnMs += performance.now() - startedMs;
    const said = saidBy(scoreOne(run, scorer, each));
    if (each.queue !== null) learner.fold(each.features, each.queue, dateOf(each), said);
    if (index % 50 === 0)
      run.options.onProgress(index, ordered.length, `message ${index} of ${ordered.length}`);
  });
  learner.compact();
  const order = isDated
    ? 'in the order of time'
    : 'without times: the queues of the history interleaved evenly';
  return {
    mode: 'predict each message, then fold it',
    note:
      `${order}; the model is loaded again once more than ${waitingShareMax * 100} % of what was learned waits, ` +
      `and compacted from ${firstCompactionMessages} messages on whenever it grew by a quarter, from 1,000 on by half (${compactions} times)`,
  };
}

function inTime(messages: readonly Remembered[]): Remembered[] {
  return [...messages].sort((a, b) => a.atMs! - b.atMs!);
}

/** Each queue's messages spread evenly over the whole, so that a history sorted by queue is not learned queue by queue. */
function spread(messages: readonly Remembered[]): Remembered[] {
  const total = new Map<string | null, number>();
  for (const { queue } of messages) total.set(queue, (total.get(queue) ?? 0) + 1);
  const seen = new Map<string | null, number>();
  return messages
    .map((each) => {
      const place = seen.get(each.queue) ?? 0;
      seen.set(each.queue, place + 1);
      return { each, at: (place + 0.5) / total.get(each.queue)! };
    })
    .sort((a, b) => a.at - b.at)
    .map(({ each }) => each);
}

/** Undated messages stand in one week, a year before the first that a mail could have. */
function dateOf(each: Remembered): number {
  return each.atMs ?? 0;
}

/** Texts are needed for guards only; without these it is enough to know whether there was any. */
function withoutText(message: Message, desk: Desk | null): Message {
  if (desk !== null && desk.guards.length > 0) return message;
  const mark = message.text.trim() === '' ? '' : '-';
  return { ...message, text: mark, ownText: mark };
}

async function* timed<T>(source: AsyncIterable<T>, spent: { readMs: number }): AsyncGenerator<T> {
  let startedMs = performance.now();
  for await (const each of source) {
    spent.readMs += performance.now() - startedMs;
    yield each;
    startedMs = performance.now();
  }
}
