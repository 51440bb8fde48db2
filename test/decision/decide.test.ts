import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type DecideInput, decide, expectedMinutes } from '../../src/decision/decide.ts';
import type { Desk } from '../../src/desk/desk.ts';
import type { Message } from '../../src/message/message.ts';
import type { Posterior } from '../../src/model/posterior.ts';
import { exampleDesk, mailOf } from '../features/example.ts';

/** Of billing (wrong route 10 minutes), leaks (25) and moving (10). */
function posteriorOf(probability: readonly number[], known = { tokens: 40, knownTokens: 30 }): Posterior {
  return {
    queues: ['billing', 'leaks', 'moving'],
    logProb: Float64Array.from(probability, Math.log),
    probability: Float64Array.from(probability),
    ...known,
  };
}

const lookFor = (lookMinutes: number): Desk => ({
  ...exampleDesk,
  costs: { ...exampleDesk.costs, lookMinutes },
});

function decided(changes: Partial<DecideInput> = {}) {
  return decide({
    posterior: posteriorOf([0.7, 0.2, 0.1]),
    message: mailOf(),
    desk: lookFor(4),
    modelKnows: true,
    draw: 0.5,
    ...changes,
  });
}

describe('expected minutes', () => {
  it('are what the other queues’ probability costs', () => {
    const minutes = expectedMinutes(posteriorOf([0.7, 0.2, 0.1]), exampleDesk);
    expect(minutes[0]).toBeCloseTo(3, 12); // (0.2 + 0.1) · 10
    expect(minutes[1]).toBeCloseTo(20, 12); // (0.7 + 0.1) · 25
    expect(minutes[2]).toBeCloseTo(9, 12); // (0.7 + 0.2) · 10
  });
});

describe('a message is', () => {
  it('routed where least is lost, when that is less than a look', () => {
    expect(decided()).toEqual({
      kind: 'routed',
      queue: 'billing',
      posterior: 0.7,
      expectedMinutes: expect.closeTo(3, 12),
      isAudit: false,
    });
  });

  it('held when a look costs less than the cheapest queue', () => {
    expect(decided({ desk: lookFor(2.9) })).toEqual({
      kind: 'held',
      queue: 'billing',
      posterior: 0.7,
      reason: 'unsure',
    });
  });

  it('routed when both cost the same', () => {
    // (1 - 0.75) · 10 = 2.5 exactly, in binary too.
    expect(decided({ posterior: posteriorOf([0.75, 0.125, 0.125]), desk: lookFor(2.5) }).kind).toBe('routed');
  });

  it('routed to a less likely queue where being wrong costs less', () => {
    // billing (1 - 0.4375) · 10 = 5.625; leaks (1 - 0.5) · 25 = 12.5; moving (1 - 0.0625) · 10 = 9.375.
    const decision = decided({ posterior: posteriorOf([0.4375, 0.5, 0.0625]), desk: lookFor(6) });
    expect(decision).toMatchObject({
      kind: 'routed',
      queue: 'billing',
      posterior: 0.4375,
      expectedMinutes: 5.625,
    });
  });

  it('held with the likeliest queue, though another would be cheaper to try', () => {
    const decision = decided({ posterior: posteriorOf([0.4375, 0.5, 0.0625]), desk: lookFor(1) });
    expect(decision).toEqual({ kind: 'held', queue: 'leaks', posterior: 0.5, reason: 'unsure' });
  });

  it('routed to the likelier of two queues that lose the same, then to the first', () => {
    // With 15 minutes for leaks both lose 7.5: billing (1 - 0.25) · 10, leaks (1 - 0.5) · 15.
    const desk = {
      ...lookFor(8),
      queues: exampleDesk.queues.map((each) =>
        each.id === 'leaks' ? { ...each, wrongRouteMinutes: 15 } : each,
      ),
    };
    expect(decided({ posterior: posteriorOf([0.25, 0.5, 0.25]), desk })).toMatchObject({ queue: 'leaks' });
    const same = decided({ posterior: posteriorOf([0.375, 0.25, 0.375]), desk: lookFor(8) });
    expect(same).toMatchObject({ kind: 'routed', queue: 'billing' });
  });

  it('marked for a look when the draw falls within the audit share', () => {
    const desk = { ...lookFor(4), auditShare: 0.1 };
    expect(decided({ desk, draw: 0.0999 })).toMatchObject({ isAudit: true });
    expect(decided({ desk, draw: 0.1 })).toMatchObject({ isAudit: false });
    expect(decided({ desk: lookFor(4), draw: 0 })).toMatchObject({ isAudit: false });
  });

  it('held when nothing was ever confirmed, without a queue', () => {
    expect(decided({ modelKnows: false })).toEqual({
      kind: 'held',
      queue: null,
      posterior: 0,
      reason: 'nothing-learned',
    });
  });

  it('held when there is no open queue to choose from', () => {
    const none = {
      queues: [],
      logProb: new Float64Array(),
      probability: new Float64Array(),
      tokens: 9,
      knownTokens: 9,
    };
    expect(decided({ posterior: none })).toEqual({
      kind: 'held',
      queue: null,
      posterior: 0,
      reason: 'unsure',
    });
  });

  it('held when under a quarter of its tokens were ever seen', () => {
    const sure = [0.98, 0.01, 0.01];
    expect(decided({ posterior: posteriorOf(sure, { tokens: 40, knownTokens: 9 }) })).toEqual({
      kind: 'held',
      queue: 'billing',
      posterior: 0.98,
      reason: 'unlike-anything-seen',
    });
    expect(decided({ posterior: posteriorOf(sure, { tokens: 40, knownTokens: 10 }) }).kind).toBe('routed');
  });

  it('not held for a few unknown tokens, when it has only a few', () => {
    expect(decided({ posterior: posteriorOf([0.98, 0.01, 0.01], { tokens: 7, knownTokens: 0 }) }).kind).toBe(
      'routed',
    );
  });
});

describe('whatever the words say', () => {
  const sure = posteriorOf([0.998, 0.001, 0.001]);
  const facts = mailOf().facts;
  const desk: Desk = {
    ...lookFor(4),
    guards: [{ id: 'danger', queue: 'leaks', phrases: ['burst main'], senders: [], fields: [] }],
  };

  it.each<[string, Partial<Message>, string]>([
    ['a virus is held', { facts: { ...facts, virus: 'fail' } }, 'suspect'],
    ['spam is held', { facts: { ...facts, spam: 'fail' } }, 'suspect'],
    [
      'a form that a program seems to have sent is held',
      { defects: [{ code: 'form-suspect', place: 'suspicion' }] },
      'suspect',
    ],
    ['an unreadable form is held', { defects: [{ code: 'form-unreadable', place: 'form' }] }, 'unreadable'],
    [
      'an empty object is held',
      { text: '', ownText: '', defects: [{ code: 'message-empty', place: 'message' }] },
      'unreadable',
    ],
    [
      'mail whose text is encrypted is held',
      { text: '', ownText: '', defects: [{ code: 'encrypted', place: '1' }] },
      'unreadable',
    ],
    [
      'automatic mail in the desk’s own name is held',
      {
        facts: { ...facts, isAutomatic: true },
        from: { address: 'help@fenmarkwater.example', domain: 'fenmarkwater.example' },
      },
      'automatic',
    ],
    [
      'mail that went round too often is held',
      { defects: [{ code: 'loop-suspected', place: 'received' }] },
      'automatic',
    ],
  ])('%s', (_title, changes, reason) => {
    expect(decided({ posterior: sure, message: mailOf(changes) })).toEqual({
      kind: 'held',
      queue: 'billing',
      posterior: 0.998,
      reason,
    });
  });

  it.each<[string, Partial<Message>]>([
    ['an automatic reply', { facts: { ...facts, isAutomatic: true } }],
    ['a delivery report', { facts: { ...facts, isAutomatic: true, isDeliveryReport: true } }],
    ['a colleague', { from: { address: 'help@fenmarkwater.example', domain: 'fenmarkwater.example' } }],
    ['mail of undecided verdicts', { facts: { ...facts, spam: 'gray', virus: 'failed' } }],
    ['mail with a damaged charset and text', { defects: [{ code: 'text-unreadable', place: '2' }] }],
  ])('%s is decided like any other', (_title, changes) => {
    expect(decided({ posterior: sure, message: mailOf(changes) })).toMatchObject({
      kind: 'routed',
      queue: 'billing',
    });
  });

  it.each<[string, Partial<Message>, boolean]>([
    ['a sure model', {}, true],
    ['an empty model', {}, false],
    ['a virus', { facts: { ...facts, virus: 'fail' } }, true],
  ])('a guard acts before %s', (_title, changes, modelKnows) => {
    const message = mailOf({ ownText: 'There is a burst main!', ...changes });
    expect(decided({ posterior: sure, message, desk, modelKnows })).toEqual({
      kind: 'guarded',
      queue: 'leaks',
      posterior: 0.001,
      guard: 'danger',
    });
  });
});

describe('laws of the least expected cost', () => {
  const probabilities = fc
    .array(fc.double({ min: 1e-6, max: 1, noNaN: true }), { minLength: 3, maxLength: 3 })
    .map((weights) => weights.map((each) => each / weights.reduce((a, b) => a + b)));
  const minutes = fc.double({ min: 0, max: 100, noNaN: true });
  const deskOf = (wrong: readonly number[], lookMinutes: number): Desk => ({
    ...lookFor(lookMinutes),
    queues: exampleDesk.queues.map((queue, k) => ({ ...queue, wrongRouteMinutes: wrong[k]! })),
  });
  const costs = fc.array(minutes, { minLength: 3, maxLength: 3 });

  it('no queue loses less than the chosen one, and the chosen one no more than a look', () => {
    fc.assert(
      fc.property(probabilities, costs, minutes, (p, wrong, look) => {
        const decision = decided({ posterior: posteriorOf(p), desk: deskOf(wrong, look) });
        const lost = p.map((_, k) => {
          let others = 0;
          for (let j = 0; j < 3; j++) if (j !== k) others += p[j]!;
          return others * wrong[k]!;
        });
        const least = Math.min(...lost);
        if (decision.kind === 'routed') {
          expect(decision.expectedMinutes).toBeCloseTo(least, 9);
          expect(decision.expectedMinutes).toBeLessThanOrEqual(look);
        } else {
          expect(least).toBeGreaterThanOrEqual(look - 1e-9);
        }
      }),
      { seed: 20263 },
    );
  });

  it('a dearer look never holds more, a dearer wrong route never routes more', () => {
    fc.assert(
      fc.property(probabilities, costs, minutes, minutes, (p, wrong, look, more) => {
        const posterior = posteriorOf(p);
        const kind = (desk: Desk) => decided({ posterior, desk }).kind;
        if (kind(deskOf(wrong, look)) === 'routed') expect(kind(deskOf(wrong, look + more))).toBe('routed');
        if (kind(deskOf(wrong, look)) === 'held') {
          expect(
            kind(
              deskOf(
                wrong.map((each) => each + more),
                look,
              ),
            ),
          ).toBe('held');
        }
      }),
      { seed: 20264 },
    );
  });
});
