import type { ScenarioMessage } from './scenario.ts';

/** The scenario as a labelled history, one JSON value a line: {"queue","mail"|"form","at"}, in order of arrival, each under its
 *  last confirmation. Messages that nobody ever confirmed are in no history. */
export function labelledLines(messages: readonly ScenarioMessage[]): string {
  return messages
    .filter((message) => message.confirmations.length > 0)
    .map((message) => `${JSON.stringify(labelled(message))}\n`)
    .join('');
}

function labelled(message: ScenarioMessage): unknown {
  const text = Buffer.from(message.bytes).toString('utf8');
  const at = new Date(message.arrivesAtMs).toISOString();
  if (message.contentType !== 'application/json') return { queue: message.trueQueue, mail: text, at };
  const { form, fields } = JSON.parse(text) as {
    form: string;
    fields: Record<string, string>;
  };
  return { queue: message.trueQueue, form: { id: form, fields }, at };
}
