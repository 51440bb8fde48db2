import { describe, expect, it } from 'vitest';
import type { Decision } from '../../src/decision/decision.ts';
import { isDecided, joinMetadata, metadataOf, saidIn } from '../../src/handlers/routing-metadata.ts';
import type { Posterior } from '../../src/model/posterior.ts';

const posterior: Posterior = {
  queues: ['billing', 'leaks', 'moving'],
  logProb: Float64Array.of(Math.log(0.7), Math.log(0.1), Math.log(0.2)),
  probability: Float64Array.of(0.7, 0.1, 0.2),
  tokens: 10,
  knownTokens: 9,
};
const context = { modelVersion: 12, schema: '0123456789abcdef', atMs: Date.UTC(2026, 2, 2, 9), trace: 'T1' };
const routed: Decision = {
  kind: 'routed',
  queue: 'billing',
  posterior: 0.7,
  expectedMinutes: 3,
  isAudit: true,
};
const common = {
  'tallypost-model': '12',
  'tallypost-schema': '0123456789abcdef',
  'tallypost-at': '2026-03-02T09:00:00.000Z',
  'tallypost-trace': 'T1',
};

describe('metadata of a decision', () => {
  it('routed, marked for a look', () => {
    expect(metadataOf(routed, posterior, context)).toEqual({
      'tallypost-decision': 'routed',
      'tallypost-queue': 'billing',
      'tallypost-posterior': '0.700000',
      'tallypost-audit': 'yes',
      'tallypost-runner-up': 'moving',
      'tallypost-runner-up-posterior': '0.200000',
      ...common,
    });
  });

  it('held', () => {
    const held: Decision = { kind: 'held', queue: 'moving', posterior: 0.2, reason: 'unsure' };
    expect(metadataOf(held, posterior, context)).toMatchObject({
      'tallypost-decision': 'held',
      'tallypost-queue': 'moving',
      'tallypost-reason': 'unsure',
      'tallypost-runner-up': 'billing',
    });
  });

  it('held without a queue says nothing of any', () => {
    const held: Decision = { kind: 'held', queue: null, posterior: 0, reason: 'nothing-learned' };
    expect(metadataOf(held, posterior, { ...context, trace: '' })).toEqual({
      'tallypost-decision': 'held',
      'tallypost-reason': 'nothing-learned',
      'tallypost-model': '12',
      'tallypost-schema': '0123456789abcdef',
      'tallypost-at': '2026-03-02T09:00:00.000Z',
    });
  });

  it('guarded, with the guard as its reason', () => {
    const guarded: Decision = { kind: 'guarded', queue: 'leaks', posterior: 0.1, guard: 'danger' };
    expect(metadataOf(guarded, posterior, context)).toMatchObject({
      'tallypost-decision': 'guarded',
      'tallypost-queue': 'leaks',
      'tallypost-posterior': '0.100000',
      'tallypost-reason': 'danger',
      'tallypost-runner-up': 'billing',
    });
  });
});

describe('joined to an object’s other metadata', () => {
  const ours = metadataOf(routed, posterior, context);

  it('keeps them and replaces what we wrote before', () => {
    const others = { source: 'web', 'tallypost-reason': 'unsure', 'tallypost-queue': 'leaks' };
    expect(joinMetadata(others, ours, 'x')).toEqual({ source: 'web', ...ours });
  });

  it('drops what can be done without when the others take the room, the decision last', () => {
    // 2,048 bytes in all: `note` and 1,910 characters leave 134. Decision 24, queue 22, posterior 27, audit 18 and at 36
    // are 127; the runner-up's 25 would be too many.
    const joined = joinMetadata({ note: 'x'.repeat(1910) }, ours, 'x');
    expect(Object.keys(joined).sort()).toEqual([
      'note',
      'tallypost-at',
      'tallypost-audit',
      'tallypost-decision',
      'tallypost-posterior',
      'tallypost-queue',
    ]);
    const size = Object.entries(joined).reduce((sum, [name, value]) => sum + name.length + value.length, 0);
    expect(size).toBeLessThanOrEqual(2048);
  });

  it('is refused when not even the decision fits', () => {
    expect(() => joinMetadata({ note: 'x'.repeat(2000) }, ours, 'inbound/a')).toThrow(
      'metadata-full at inbound/a',
    );
  });
});

describe('what was said', () => {
  const written = metadataOf(routed, posterior, context);

  it('is read back from what was written', () => {
    expect(saidIn(written)).toEqual({ queue: 'billing', posterior: 0.7, isAudit: true });
    expect(isDecided(written)).toBe(true);
  });

  it.each([
    ['nothing was decided', {}],
    ['a guard decided', { ...written, 'tallypost-decision': 'guarded' }],
    ['no queue was named', { 'tallypost-decision': 'held', 'tallypost-reason': 'nothing-learned' }],
    ['the posterior is no probability', { ...written, 'tallypost-posterior': '7' }],
    ['the posterior is no number', { ...written, 'tallypost-posterior': 'high' }],
  ])('is nothing when %s', (_title, metadata) => {
    expect(saidIn(metadata as Record<string, string>)).toBeNull();
  });
});
