import { foldText, wordsOf } from '../text/words.ts';
import type { DeskFile } from './desk-file.ts';
import { type DeskProblem, pointerOf, shownValue } from './desk-problem.ts';

/** What must hold between the members of a desk's file whose single members are right. */
export function brokenRules(file: DeskFile): DeskProblem[] {
  const queues = new Set(file.queues.map((queue) => queue.id));
  const forms = new Set(file.forms);
  return [
    ...timeZoneProblems(file.timeZone),
    ...repeated(
      file.queues.map((queue) => queue.id),
      (i) => ['queues', i, 'id'],
    ),
    ...repeated(
      file.senderClasses.map((each) => each.id),
      (i) => ['senderClasses', i, 'id'],
    ),
    ...reserved(
      file.senderClasses.map((each) => each.id),
      (i) => ['senderClasses', i, 'id'],
      ['own'],
    ),
    ...repeated(
      file.references.map((each) => each.id),
      (i) => ['references', i, 'id'],
    ),
    ...repeated(file.ownAddresses.map(fold), (i) => ['ownAddresses', i]),
    ...repeated(file.ownDomains.map(fold), (i) => ['ownDomains', i]),
    ...repeated(file.forms, (i) => ['forms', i]),
    ...reserved(file.forms, (i) => ['forms', i], []),
    ...repeated(
      file.fields.map((each) => JSON.stringify([each.form, each.field])),
      (i) => ['fields', i],
    ),
    ...file.fields.flatMap((field, i) => fieldProblems(field, ['fields', i], forms)),
    ...repeated(
      file.guards.map((guard) => guard.id),
      (i) => ['guards', i, 'id'],
    ),
    ...file.guards.flatMap((guard, i) => guardProblems(guard, i, queues, forms)),
    ...intakeProblems(file.intake, queues, forms),
  ];
}

type Path = (string | number)[];

function guardProblems(
  guard: DeskFile['guards'][number],
  index: number,
  queues: ReadonlySet<string>,
  forms: ReadonlySet<string>,
): DeskProblem[] {
  const at: Path = ['guards', index];
  const problems: DeskProblem[] = [];
  if (!queues.has(guard.queue)) {
    problems.push(problem([...at, 'queue'], 'the id of a queue of this file', shownValue(guard.queue)));
  }
  if (guard.phrases.length + guard.senders.length + guard.fields.length === 0) {
    problems.push(problem(at, 'at least one phrase, sender or field', 'none'));
  }
  guard.phrases.forEach((phrase, i) => {
    if (wordsOf(foldText(phrase)).length > 0) return;
    problems.push(problem([...at, 'phrases', i], 'at least one letter or digit', shownValue(phrase)));
  });
  guard.fields.forEach((field, i) => {
    problems.push(...fieldProblems(field, [...at, 'fields', i], forms));
  });
  return problems;
}

function intakeProblems(
  intake: DeskFile['intake'],
  queues: ReadonlySet<string>,
  forms: ReadonlySet<string>,
): DeskProblem[] {
  if (intake === undefined) return [];
  const at: Path = ['intake', 'forms'];
  return [
    ...repeated(
      intake.forms.map((form) => form.id),
      (i) => [...at, i, 'id'],
    ),
    ...intake.forms.flatMap((form, i) => {
      const names = form.fields.map((field) => field.name);
      const isMissing = form.senderField !== null && !names.includes(form.senderField);
      return [
        ...(forms.has(form.id) ? [] : [problem([...at, i, 'id'], 'one of `forms`', shownValue(form.id))]),
        ...repeated(names, (j) => [...at, i, 'fields', j, 'name']),
        ...(isMissing
          ? [
              problem(
                [...at, i, 'senderField'],
                'the name of a field of this form',
                shownValue(form.senderField),
              ),
            ]
          : []),
      ];
    }),
    ...Object.entries(intake.confirmations.queueNames)
      .filter(([, queue]) => !queues.has(queue))
      .map(([name, queue]) =>
        problem(
          ['intake', 'confirmations', 'queueNames', name],
          'the id of a queue of this file',
          shownValue(queue),
        ),
      ),
  ];
}

function fieldProblems(
  field: DeskFile['fields'][number],
  at: Path,
  forms: ReadonlySet<string>,
): DeskProblem[] {
  const values = field.values.map(fold);
  return [
    ...(forms.has(field.form) ? [] : [problem([...at, 'form'], 'one of `forms`', shownValue(field.form))]),
    ...repeated(values, (i) => [...at, 'values', i]),
    ...reserved(values, (i) => [...at, 'values', i], []),
  ];
}

function timeZoneProblems(timeZone: string): DeskProblem[] {
  try {
    new Intl.DateTimeFormat('en', { timeZone });
    return [];
  } catch {
    return [problem(['timeZone'], 'an IANA time zone such as Europe/London', shownValue(timeZone))];
  }
}

function repeated(names: readonly string[], at: (index: number) => Path): DeskProblem[] {
  return names.flatMap((name, i) =>
    names.indexOf(name) < i
      ? [problem(at(i), `no repetition of ${pointerOf(at(names.indexOf(name)))}`, shownValue(name))]
      : [],
  );
}

/** `missing` and `other` begin every closed list by themselves. */
function reserved(
  names: readonly string[],
  at: (index: number) => Path,
  more: readonly string[],
): DeskProblem[] {
  const taken = new Set(['missing', 'other', ...more]);
  return names.flatMap((name, i) =>
    taken.has(fold(name))
      ? [problem(at(i), `none of ${[...taken].join(', ')}: they are always there`, shownValue(name))]
      : [],
  );
}

function problem(path: Path, expected: string, got: string): DeskProblem {
  return { pointer: pointerOf(path), expected, got };
}

/** As choices and addresses are compared. */
function fold(text: string): string {
  return foldText(text).trim();
}
