import { percent } from './percent.ts';
import type { Waiting } from './waiting.ts';

/** Why a message waits, in words. */
export function whyWords(waiting: Waiting, titleOf: (queue: string) => string): string {
  const queue = waiting.queue === null ? '' : titleOf(waiting.queue);
  const likely = percent(waiting.posterior);
  switch (waiting.why) {
    case 'unsure':
      return queue === ''
        ? 'No queue was likely enough.'
        : `Not sure enough: ${queue} was likeliest, at ${likely}.`;
    case 'unlike-anything-seen':
      return 'Hardly any of its words were seen before.';
    case 'nothing-learned':
      return 'Nothing had been confirmed yet.';
    case 'model-unusable':
      return 'What was learned could not be used then.';
    case 'unreadable':
      return 'Its text could not be read.';
    case 'suspect':
      return 'The mail service takes it for spam or for harmful.';
    case 'automatic':
      return 'A machine sent it, and it might go in circles.';
    case 'look':
      return `Drawn at random for a look. It went to ${queue}, at ${likely}.`;
  }
}
