import * as z from 'zod/mini';
import { bounds } from '../bounds.ts';
import { intakeFile } from './intake-file.ts';

/** The desk's file as it is written: the shape of single members. What holds between members is checked in
 *  desk-rules.ts. Every check's message says what was expected, to stand behind `expected`. */

const textOf = (charsMax: number, what: string) =>
  z
    .string()
    .check(
      z.regex(/\S/, `${what}, not blank`),
      z.maxLength(charsMax, `${what} of at most ${charsMax} characters`),
    );
const listOf = <T extends z.ZodMiniType>(item: T, itemsMax: number) =>
  z.array(item).check(z.maxLength(itemsMax, `at most ${itemsMax} items`));
const optionalListOf = <T extends z.ZodMiniType>(item: T, itemsMax: number) =>
  z._default(listOf(item, itemsMax), []);
const described = <T extends z.ZodMiniType>(schema: T, description: string) =>
  schema.check(z.describe(description));

const idPattern = /^[a-z0-9][a-z0-9-]{0,62}$/;
const id = (what: string) =>
  z
    .string()
    .check(z.regex(idPattern, `${what}: 1 to 63 of a-z, 0-9 and -, beginning with a letter or digit`));
const minutes = (what: string) =>
  described(
    z
      .number(`minutes, a number of at most ${bounds.costMinutesMax}`)
      .check(
        z.gte(0, 'minutes, at least 0'),
        z.lte(bounds.costMinutesMax, `minutes, at most ${bounds.costMinutesMax}`),
      ),
    what,
  );
const address = z
  .string()
  .check(
    z.regex(/^[^\s@]{1,64}@[^\s@]{1,255}$/u, 'an e-mail address such as help@desk.example'),
    z.maxLength(bounds.addressCharsMax, `an address of at most ${bounds.addressCharsMax} characters`),
  );
const domainPattern =
  /^(?=.{1,253}$)[\p{L}\p{N}]([\p{L}\p{M}\p{N}-]*[\p{L}\p{M}\p{N}])?(\.[\p{L}\p{N}]([\p{L}\p{M}\p{N}-]*[\p{L}\p{M}\p{N}])?)*$/u;
const domain = z.string().check(z.regex(domainPattern, 'a domain such as desk.example'));
const sender = z
  .string()
  .check(
    z.regex(
      /^[^\s@]{0,64}@[^\s@]{1,255}$/u,
      'an address such as a@b.example, or a domain such as @b.example',
    ),
  );
const formId = described(
  z
    .string()
    .check(z.regex(/^[A-Za-z0-9][A-Za-z0-9._-]{0,62}$/, 'a form id: 1 to 63 of A-Z, a-z, 0-9, dot, _ and -')),
  'The id that submissions of this form carry.',
);
const fieldName = described(textOf(bounds.fieldNameCharsMax, 'a field name'), 'A field of that form.');
const choice = textOf(bounds.choiceCharsMax, 'a choice');

const closedField = z.strictObject({
  form: formId,
  field: fieldName,
  values: described(
    listOf(choice, bounds.choicesMax).check(z.minLength(1, 'at least one choice')),
    'Its choices, compared without regard to case. `missing` and `other` are always there.',
  ),
});

const queue = z.strictObject({
  id: described(id('a queue id'), 'Written into the metadata of a routed message. Never reuse one.'),
  title: textOf(bounds.titleCharsMax, 'a title'),
  wrongRouteMinutes: z.optional(
    minutes(
      'Staff minutes lost when a message of another queue is sent here; costs.wrongRouteMinutes if left out.',
    ),
  ),
});

const guard = z.strictObject({
  id: described(id('a guard id'), 'Written into the metadata of a guarded message.'),
  queue: described(id('a queue id'), 'Where the message goes, whatever the model says.'),
  phrases: described(
    optionalListOf(textOf(bounds.phraseCharsMax, 'a phrase'), bounds.phrasesMax),
    'Any of these in the subject or the writer’s own text; whole words, without regard to case and punctuation.',
  ),
  senders: described(
    optionalListOf(sender, bounds.sendersMax),
    'Any of these senders: an address, or @domain for a domain and all below it. Senders can be forged.',
  ),
  fields: described(optionalListOf(closedField, bounds.fieldsMax), 'Any of these choices in a form.'),
});

export const deskFile = z.strictObject({
  $schema: described(z.optional(z.string()), 'Where editors find this schema.'),
  version: z.literal(1, '1, the version of this file’s format'),
  name: described(textOf(bounds.titleCharsMax, 'a name'), 'Whose desk this is.'),
  timeZone: described(
    z._default(textOf(64, 'a time zone'), 'UTC'),
    'IANA name of the desk’s time zone, such as Europe/London: weekday and hour are read on its clock.',
  ),
  ownAddresses: described(
    optionalListOf(address, bounds.ownAddressesMax),
    'Addresses at which the desk receives mail; which one was written to is evidence.',
  ),
  ownDomains: described(
    optionalListOf(domain, bounds.domainsMax),
    'Domains of the company itself, subdomains included.',
  ),
  queues: described(
    listOf(queue, bounds.queuesMax).check(z.minLength(1, 'at least one queue')),
    'Where messages can go, in the order in which they are shown.',
  ),
  costs: described(
    z.strictObject({
      lookMinutes: minutes('Staff minutes for a person’s look at a held message.'),
      wrongRouteMinutes: minutes('Staff minutes lost when a message is sent to the wrong queue.'),
    }),
    'A message is routed where the expected loss is least, and held when a look costs less than that.',
  ),
  senderClasses: described(
    optionalListOf(
      z.strictObject({ id: id('a class id'), domains: listOf(domain, bounds.domainsMax) }),
      bounds.senderClassesMax,
    ),
    'Kinds of senders told apart by domain, subdomains included: councils, partners, suppliers.',
  ),
  references: described(
    optionalListOf(
      z.strictObject({
        id: id('a reference id'),
        pattern: described(
          z
            .string()
            .check(
              z.regex(
                /^(?=.*[#@])[\x21-\x7e]([\x20-\x7e]*[\x21-\x7e])?$/,
                'printable ASCII with at least one # or @, no space at either end',
              ),
              z.maxLength(bounds.patternCharsMax, `at most ${bounds.patternCharsMax} characters`),
            ),
          '# is one digit, @ one letter, anything else itself: FW-########',
        ),
      }),
      bounds.referencesMax,
    ),
    'Shapes of account numbers and the like; that one is in the text is evidence.',
  ),
  forms: described(optionalListOf(formId, bounds.formsMax), 'Forms whose submissions arrive here.'),
  fields: described(
    optionalListOf(closedField, bounds.fieldsMax),
    'Fields of forms that are a choice from a list. All other fields are read as text.',
  ),
  guards: described(optionalListOf(guard, bounds.guardsMax), 'In order; the first that matches acts.'),
  auditShare: described(
    z._default(z.number('a share from 0 to 1').check(z.gte(0, 'at least 0'), z.lte(1, 'at most 1')), 0),
    'Share of routed messages marked at random for a person’s look, so that the accuracy shown is unbiased.',
  ),
  halfLifeDays: described(
    z._default(
      z.nullable(
        z
          .number('days above 0, or null')
          .check(z.gte(1, 'at least 1 day'), z.lte(36500, 'at most 36500 days')),
      ),
      null,
    ),
    'Confirmations lose half their weight in this many days; null: never.',
  ),
  intake: described(z.optional(intakeFile), 'Forms and confirmations over HTTPS; without it none are taken.'),
});

export type DeskFile = z.infer<typeof deskFile>;
