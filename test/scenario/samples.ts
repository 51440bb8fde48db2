import { generateScenario, type ScenarioMessage } from './scenario.ts';

export interface Sample {
  /** File name under events/messages. */
  readonly name: string;
  readonly bytes: Uint8Array;
  readonly message: ScenarioMessage;
}

const wanted: readonly (readonly [name: string, (text: string, message: ScenarioMessage) => boolean])[] = [
  [
    'plain.eml',
    (text) =>
      /^Content-Type: text\/plain/m.test(text) &&
      !/^(Subject: Re|Content-Transfer-Encoding: base64)/m.test(text),
  ],
  ['html.eml', (text) => /^MIME-Version: 1.0\r\nContent-Type: text\/html/m.test(text)],
  [
    'alternative-with-attachment.eml',
    (text) => /multipart\/mixed/.test(text) && /multipart\/alternative/.test(text),
  ],
  ['reply-with-quotation.eml', (text) => /^Subject: Re: /m.test(text) && /^> /m.test(text)],
  ['forwarded.eml', (text) => /^Subject: Fwd: /m.test(text) && /Forwarded message/.test(text)],
  [
    'polish-encoded-words.eml',
    (text) => /^Subject: =\?utf-8\?/m.test(text) && /charset=iso-8859-2/.test(text),
  ],
  [
    'german-quoted-printable.eml',
    (text) => /charset=iso-8859-1\r\nContent-Transfer-Encoding: quoted-printable/.test(text),
  ],
  [
    'automatic-reply.eml',
    (text) => /^Auto-Submitted: auto-replied/m.test(text) && /out of the office/.test(text),
  ],
  ['delivery-report.eml', (text) => /report-type=delivery-status/.test(text)],
  ['guarded-electrics.eml', (text) => /onto the electrics/.test(text) && !/base64/.test(text)],
  ['contact-form.json', (text) => /"form":"contact"/.test(text)],
  ['leak-form.json', (text) => /"form":"leak"/.test(text)],
];

/** A handful of the scenario's messages, one of each kind. */
export function samples(): Sample[] {
  const { messages } = generateScenario(1);
  return wanted.map(([name, isWanted]) => {
    const isForm = name.endsWith('.json');
    const found = messages.find((message) => {
      const text = Buffer.from(message.bytes).toString('utf8');
      return (message.contentType === 'application/json') === isForm && isWanted(text, message);
    });
    if (found === undefined) throw new Error(`no message like ${name}`);
    return { name, bytes: found.bytes, message: found };
  });
}
