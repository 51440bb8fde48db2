import { beforeAll, describe, expect, test } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { defectKinds } from '../../src/message/defects.ts';
import { type Report, runInChild } from './child.ts';
import { hostileInputs } from './hostile-inputs.ts';
import type { HostileResult } from './run-hostile.ts';

let report: Report<HostileResult>;

/** All inputs are parsed once, in one process of their own. */
beforeAll(async () => {
  report = await runInChild<HostileResult>('./run-hostile.ts');
  const all = [...report.results.values()];
  const slowest = all.reduce((a, b) => (b.cpuMs > a.cpuMs ? b : a));
  console.log(
    `hostile inputs: ${all.length}; slowest ${slowest.cpuMs.toFixed(0)} ms of CPU (${slowest.name}); peak memory ${Math.max(...all.map(({ peakMb }) => peakMb)).toFixed(0)} MB`,
  );
}, 600_000);

describe('hostile inputs', () => {
  test('none of them ends or stalls the process', () => {
    expect(report.stuckAt).toBeNull();
    expect(report.results.size).toBe(hostileInputs.length);
  });

  test.each(hostileInputs.map(({ name }) => name))('%s', (name) => {
    expect(report.results.get(name)?.faults).toEqual([]);
  });

  test('each is parsed within the deadline and one piece of work more', () => {
    // 5 s of deadline by a monotonic clock; the rest is for what follows it and for a machine that does other things.
    const slow = [...report.results.values()].filter(({ cpuMs }) => cpuMs > 3 * bounds.parseMsMax);
    expect(slow).toEqual([]);
  });

  test('all of them together stay below 256 MB', () => {
    const peakMb = Math.max(...[...report.results.values()].map((result) => result.peakMb));
    expect(peakMb).toBeLessThan(256);
  });

  test('their names are different and there are at least 120', () => {
    expect(new Set(hostileInputs.map(({ name }) => name)).size).toBe(hostileInputs.length);
    expect(hostileInputs.length).toBeGreaterThanOrEqual(120);
  });
});

describe('limits of the parser', () => {
  // Which input reaches which limit, and the defect that says so. parseMsMax is reached with a clock of the test's own in
  // test/message/mail.test.ts; replyLineCharsMax and parsePieceBytes cut nothing.
  const reachedBy: [limit: keyof typeof bounds, input: string, defect: keyof typeof defectKinds][] = [
    ['rawBytesMax', 'mail of 45 MB, more than the receiving service takes', 'raw-cut'],
    ['headerBytesMax', '20 fields of recipients, 50 KB each', 'header-cut'],
    ['headerFieldBytesMax', 'a subject of 10 MB', 'header-cut'],
    ['partHeaderBytesMax', 'a part with a header of 300 KB', 'header-cut'],
    ['partHeadersBytesMax', '98 parts, each with a file name of 6 KB of encoded words', 'header-cut'],
    ['partsMax', '1,000 parts', 'parts-cut'],
    ['partDepthMax', '21 multiparts deep', 'depth-cut'],
    ['textBytesMax', '10 MB of text in base64', 'text-cut'],
    ['htmlBytesMax', 'HTML of 5 MB: <b>x</b> again and again', 'html-cut'],
    ['preambleBytesMax', 'multipart without any boundary line and 300 KB of text', 'text-cut'],
    ['textCharsMax', '25,000 words that nobody ever used', 'text-cut'],
    ['subjectCharsMax', 'a subject of 60 KB of encoded words', 'subject-cut'],
    ['subjectBytesMax', 'a subject of 60 KB of white space', 'subject-cut'],
    ['recipientsMax', '10,000 recipients in one field', 'recipients-cut'],
    ['addressCharsMax', 'a sender address of 10 KB', 'address-unreadable'],
    ['receivedMax', '150 Received fields: mail that goes round', 'loop-suspected'],
    ['htmlDepthMax', '500 KB of lists inside lists', 'html-depth-cut'],
    ['styleCharsMax', 'a style sheet of 500 KB of braces', 'style-cut'],
    ['styleRulesMax', 'a style sheet of 600 rules', 'style-cut'],
    ['attributeCharsMax', 'a style of 500 KB', 'style-cut'],
    ['defectsMax', '98 parts, each with something wrong', 'defects-cut'],
    ['formBytesMax', 'a form of 1.5 MB', 'form-cut'],
    ['formFieldsMax', 'a form of 10,000 fields', 'fields-cut'],
    ['fieldNameCharsMax', 'a field name of 100 KB', 'field-cut'],
  ];
  test.each(reachedBy)('%s is reached by: %s', (_limit, input, defect) => {
    expect(report.results.get(input)?.defects).toContain(defect);
  });

  test('every kind of defect that cuts is seen at least once', () => {
    const seen = new Set([...report.results.values()].flatMap(({ defects }) => defects));
    const cuts = Object.entries(defectKinds)
      .filter(([code, kind]) => kind === 'bound' && code !== 'time-cut')
      .map(([code]) => code);
    expect(cuts.filter((code) => !seen.has(code))).toEqual([]);
  });
});
