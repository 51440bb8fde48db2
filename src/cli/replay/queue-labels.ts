import type { Desk } from '../../desk/desk.ts';

/** Which queue a label of a history means. */
export interface QueueLabels {
  /** The queue's id; null when the desk has no such queue and none may be added. */
  queueOf(label: string): string | null;
  /** Ids with the labels they stand for, in order of first appearance. */
  queues(): readonly { readonly id: string; readonly title: string }[];
}

/** Every label becomes a queue when `learn` first meets it; `queueOf` then only looks up. */
export function collectLabels(): QueueLabels & { learn(label: string): string } {
  const idOf = new Map<string, string>();
  const taken = new Set<string>();
  return {
    learn(label) {
      const known = idOf.get(label);
      if (known !== undefined) return known;
      const plain = queueIdFrom(label);
      let id = plain;
      for (let next = 2; taken.has(id); next += 1) id = `${plain.slice(0, 56)}-${next}`;
      idOf.set(label, id);
      taken.add(id);
      return id;
    },
    queueOf: (label) => idOf.get(label) ?? null,
    queues: () => [...idOf].map(([title, id]) => ({ id, title })),
  };
}

/** Labels of a history against a desk's own queues: by id, by title, or by the id that the label would become. */
export function matchLabels(desk: Desk): QueueLabels {
  const idOf = new Map<string, string>();
  for (const { id, title } of desk.queues) idOf.set(title, id);
  for (const { id } of desk.queues) idOf.set(id, id);
  const ids = new Set(desk.queues.map(({ id }) => id));
  return {
    queueOf(label) {
      const found = idOf.get(label);
      if (found !== undefined) return found;
      const plain = queueIdFrom(label);
      return ids.has(plain) ? plain : null;
    },
    queues: () => desk.queues,
  };
}

/** A label in the letters that a queue's id may have: `Card arrival!` becomes `card-arrival`. */
export function queueIdFrom(label: string): string {
  const plain = label
    .normalize('NFKD')
    .toLowerCase()
    .replace(/\p{M}+/gu, '')
    .replace(/[^a-z0-9]+/g, '-')
    .replace(/^-+|-+$/g, '')
    .slice(0, 63)
    .replace(/-+$/, '');
  return plain === '' ? 'queue' : plain;
}
