import * as z from 'zod/mini';
import { bounds } from '../bounds.ts';

/** The `intake` member of the desk's file: what the HTTPS intake takes and from whom. */

const line = (charsMax: number, what: string) =>
  z
    .string()
    .check(
      z.regex(/\S/, `${what}, not blank`),
      z.maxLength(charsMax, `${what} of at most ${charsMax} characters`),
    );
const fieldName = line(bounds.fieldNameCharsMax, 'a field name');
const optionalName = z._default(z.nullable(fieldName), null);
const described = <T extends z.ZodMiniType>(schema: T, description: string) =>
  schema.check(z.describe(description));
/** RFC 6901 section 3: `/` before every token, `~` only as `~0` or `~1`. */
const jsonPointer = z
  .string()
  .check(
    z.regex(/^(\/([^~]|~[01])*)+$/u, 'a JSON Pointer (RFC 6901) such as /case/id'),
    z.maxLength(200, 'at most 200 characters'),
  );
const origin = z
  .string()
  .check(
    z.regex(
      /^https?:\/\/[a-z0-9.-]+(:\d{1,5})?$/,
      'an origin such as https://www.desk.example, without a path',
    ),
  );

const intakeField = z.strictObject({
  name: fieldName,
  isRequired: z._default(z.boolean('true or false'), false),
  charactersMax: described(
    z._default(
      z
        .int('a whole number')
        .check(
          z.gte(1, 'at least 1'),
          z.lte(bounds.intakeFormBytesMax, `at most ${bounds.intakeFormBytesMax}`),
        ),
      5000,
    ),
    'Longer values are refused.',
  ),
  values: described(
    z._default(
      z.nullable(
        z
          .array(line(bounds.choiceCharsMax, 'a choice'))
          .check(
            z.minLength(1, 'at least one choice'),
            z.maxLength(bounds.choicesMax, `at most ${bounds.choicesMax} items`),
          ),
      ),
      null,
    ),
    'The only values taken; null: any text.',
  ),
});

const intakeForm = z.strictObject({
  id: described(
    z
      .string()
      .check(
        z.regex(/^[A-Za-z0-9][A-Za-z0-9._-]{0,62}$/, 'a form id: 1 to 63 of A-Z, a-z, 0-9, dot, _ and -'),
      ),
    'One of `forms`; the last part of its address.',
  ),
  fields: z
    .array(intakeField)
    .check(
      z.minLength(1, 'at least one field'),
      z.maxLength(bounds.fieldsMax, `at most ${bounds.fieldsMax} items`),
    ),
  senderField: described(optionalName, 'The field with the sender’s e-mail address.'),
  trapField: described(optionalName, 'A field hidden from people by style; only programs fill it.'),
  shownAtField: described(
    optionalName,
    'A field that the page fills with the time it was shown, in ms since 1970.',
  ),
  secondsMin: described(
    z._default(z.number('seconds').check(z.gte(0, 'at least 0'), z.lte(60, 'at most 60')), 3),
    'Sent sooner after being shown: a program.',
  ),
  onSuspect: described(
    z._default(z.enum(['hold', 'refuse'], 'hold or refuse'), 'hold'),
    'hold: a person looks at what a program seems to have sent; refuse: 422.',
  ),
  thanksUrl: described(
    z._default(
      z.nullable(z.string().check(z.regex(/^https:\/\/[\x21-\x7e]{1,500}$/, 'an https address'))),
      null,
    ),
    'Where a browser goes after a form without scripts.',
  ),
});

export const intakeFile = z.strictObject({
  origins: described(
    z._default(
      z.array(origin).check(z.maxLength(bounds.domainsMax, `at most ${bounds.domainsMax} items`)),
      [],
    ),
    'Whose pages may post forms from a browser.',
  ),
  forms: z._default(
    z.array(intakeForm).check(z.maxLength(bounds.formsMax, `at most ${bounds.formsMax} items`)),
    [],
  ),
  confirmations: described(
    z._default(
      z.strictObject({
        message: jsonPointer,
        queue: jsonPointer,
        by: jsonPointer,
        at: jsonPointer,
        queueNames: described(
          z._default(z.record(z.string(), z.string()), {}),
          'The helpdesk’s names of queues to ids of this file.',
        ),
      }),
      { message: '/message', queue: '/queue', by: '/by', at: '/at', queueNames: {} },
    ),
    'Where the helpdesk’s JSON holds the parts of a confirmation.',
  ),
});

export type IntakeFile = z.infer<typeof intakeFile>;
