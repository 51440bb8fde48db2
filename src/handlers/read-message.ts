import { bounds } from '../bounds.ts';
import type { World } from '../ledger/world.ts';
import { parseForm } from '../message/form.ts';
import { parseMail } from '../message/mail.ts';
import type { Message } from '../message/message.ts';
import type { ObjectHead } from '../store/store.ts';

export interface ReadObject {
  readonly head: ObjectHead;
  /** Null when `isWanted` said no to the head. */
  readonly message: Message | null;
  /** What the parser threw, which it never should; `message` is then an empty one with the defect `parser-failed`. */
  readonly parserError: unknown;
}

/** Reads and parses the object of a message; null when there is none. Rejects when the store fails, also in the middle of
 *  the body: half a message must not pass for a whole one. */
export async function readMessage(
  world: World,
  key: string,
  isWanted: (head: ObjectHead) => boolean,
): Promise<ReadObject | null> {
  const found = await world.store.stream(key);
  if (found === null) return null;
  const { head, chunks } = found;
  if (!isWanted(head)) {
    // Opens and closes the body, which gives its connection back.
    for await (const _ of chunks) break;
    return { head, message: null, parserError: null };
  }
  let failure: { readonly error: unknown } | null = null;
  const watched = (async function* () {
    try {
      yield* chunks;
    } catch (error) {
      failure = { error };
      throw error;
    }
  })();
  try {
    const message = isForm(head)
      ? // One byte more than a form may have, so that the parser sees that there is more.
        parseForm(await bytesUpTo(watched, bounds.formBytesMax + 1))
      : await parseMail(watched, { nowMs: world.nowMs });
    if (failure === null) return { head, message, parserError: null };
  } catch (error) {
    // A message that no program can read is one for a person, not one to try again for ever.
    if (failure === null) return { head, message: unreadable(head), parserError: error };
  }
  throw (failure as { readonly error: unknown }).error;
}

function unreadable(head: ObjectHead): Message {
  return {
    channel: isForm(head) ? 'form' : 'mail',
    messageId: '',
    from: null,
    recipients: [],
    subject: '',
    text: '',
    ownText: '',
    attachments: [],
    facts: {
      isReply: false,
      isAutomatic: false,
      isList: false,
      isDeliveryReport: false,
      spam: 'missing',
      virus: 'missing',
    },
    sentAtMs: null,
    form: null,
    defects: [{ code: 'parser-failed', place: 'message' }],
  };
}

/** Forms are stored as JSON, by name or by type; everything else is mail. */
export function isForm({ key, contentType }: ObjectHead): boolean {
  return key.endsWith('.json') || /^application\/json\b/i.test(contentType);
}

/** The beginning of a body, at most `bytesMax` of it; the rest is not read. */
export async function bytesUpTo(chunks: AsyncIterable<Uint8Array>, bytesMax: number): Promise<Uint8Array> {
  const parts: Uint8Array[] = [];
  let length = 0;
  for await (const chunk of chunks) {
    parts.push(chunk);
    length += chunk.length;
    if (length >= bytesMax) break;
  }
  return Buffer.concat(parts).subarray(0, bytesMax);
}
