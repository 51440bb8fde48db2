import { describe, expect, it } from 'vitest';
import { collectLabels, matchLabels, queueIdFrom } from '../../src/cli/replay/queue-labels.ts';
import type { Desk } from '../../src/desk/desk.ts';

describe('a label becomes a queue id', () => {
  it.each([
    ['billing', 'billing'],
    ['card_arrival', 'card-arrival'],
    ['comp.sys.mac.hardware', 'comp-sys-mac-hardware'],
    ['  Straße & Café?  ', 'stra-e-cafe'],
    ['Москва', 'queue'],
    ['7', '7'],
    ['x'.repeat(80), 'x'.repeat(63)],
  ])('%s', (label, id) => {
    expect(queueIdFrom(label)).toBe(id);
    expect(id).toMatch(/^[a-z0-9][a-z0-9-]{0,62}$/);
  });

  it('that no other label has', () => {
    const labels = collectLabels();
    expect(['A b', 'a-b', 'A b', 'a_b', 'Москва', 'Київ'].map((label) => labels.learn(label))).toEqual([
      'a-b',
      'a-b-2',
      'a-b',
      'a-b-3',
      'queue',
      'queue-2',
    ]);
    expect(labels.queueOf('a_b')).toBe('a-b-3');
    expect(labels.queueOf('never met')).toBeNull();
    expect(labels.queues()).toContainEqual({ id: 'a-b-2', title: 'a-b' });
  });
});

it("labels are matched with a desk's queues by id, title or the id they would become", () => {
  const queue = (id: string, title: string) => ({ id, title, wrongRouteMinutes: 8 });
  const labels = matchLabels({
    queues: [queue('moves', 'Moving home'), queue('leaks', 'moves')],
  } as unknown as Desk);
  expect(['moves', 'Moving home', 'Leaks', 'sewers'].map((label) => labels.queueOf(label))).toEqual([
    'moves',
    'moves',
    'leaks',
    null,
  ]);
});
