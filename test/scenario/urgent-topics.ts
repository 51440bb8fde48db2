import type { Topic } from './topic.ts';

/** Rare letters that the fixed guards of events/desk.json must catch, whatever the counts say. */
// biome-ignore format: prose in tables
export const urgentTopics: readonly Topic[] = [
  {
    id: 'electrics', queues: { 'leaks-and-bursts': 1 }, weight: 0.5,
    subjects: ['Water in the hall', 'Please hurry', 'Burst pipe {address}'],
    core: ['Water from the burst pipe is running into the fuse box.', 'It drips onto the electrics under the stairs.', 'My husband got an electric shock from the wet wall.'],
    more: ['The stop tap does not turn.', 'We are standing outside.', 'Nobody answers your telephone.'],
  },
  {
    id: 'poison', queues: { 'water-quality': 1 }, weight: 0.3,
    subjects: ['Child ill', 'Water makes us ill'],
    core: ['My daughter drank it and is being sick.', 'My neighbour was taken to hospital after drinking from the tap.'],
    more: ['It tastes of {taste}.', 'The water is {colour}.'],
  },
  {
    id: 'despair', queues: { complaints: 1 }, weight: 0.3,
    subjects: ['I cannot go on', 'Your reminder'],
    core: ['With this bill I see no reason to live.', 'If you send one more reminder I will harm myself.'],
    more: ['I have lost my work.', 'The charges are £{amount}.', 'Nobody listens.'],
  },
  {
    id: 'court', queues: { complaints: 1 }, weight: 0.4,
    subjects: ['Letter before action', 'Claim {job}'],
    core: ['This is a letter before claim over the damage at {address}.', 'Pay £{amount} within 14 days or we will issue proceedings.'],
    more: ['The invoice of the builder is attached.', 'The leak was reported {when}.', 'Our solicitor has the photographs.'],
  },
];
