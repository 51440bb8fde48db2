import type { Block, Fit } from '../model/fit.ts';
import type { Health } from './report-data.ts';

const regions: Readonly<Record<string, string>> = {
  subject: 'words of the subject',
  word: 'single words',
  pair: 'pairs of neighbouring words',
  gram: 'pieces of words, four letters long',
};
const groups: Readonly<Record<string, string>> = {
  channel: 'mail or form',
  recipient: 'the address written to',
  sender: 'the kind of sender',
  thread: 'new matter or reply',
  origin: 'person or machine',
  attachments: 'what is attached',
  length: 'the length',
  time: 'weekday and hour',
  script: 'the script',
  reference: 'references such as account numbers',
  form: 'which form was used',
  field: 'what was chosen in a form',
};

/** Exponents in words: the readings of one region are added up, since they say the same thing twice. Most first. */
export function describeWeights(fit: Fit): Health['weights'] {
  const sums = new Map<string, number>();
  for (const block of fit.blocks) {
    const what = nameOf(block);
    sums.set(what, (sums.get(what) ?? 0) + block.exponent);
  }
  return [...sums]
    .map(([what, exponent]) => ({ what, exponent }))
    .sort((a, b) => b.exponent - a.exponent || (a.what < b.what ? -1 : 1));
}

function nameOf(block: Block): string {
  if (block.kind === 'prior') return 'how much mail each queue gets';
  if (block.kind === 'slots') return groups[block.group] ?? block.group;
  return regions[block.region] ?? block.region;
}
