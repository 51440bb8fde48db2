import { bounds } from '../../bounds.ts';
import type { Fault } from '../../errors.ts';
import { parseForm } from '../../message/form.ts';
import { parseMail } from '../../message/mail.ts';
import type { Message } from '../../message/message.ts';
import { readLabelled } from '../labelled/read-labelled.ts';

export interface HistoryMessage {
  readonly label: string;
  /** The history's own time, else the message's; null when neither can be believed. */
  readonly atMs: number | null;
  readonly message: Message;
}

/** What a history was like; JSON-able. */
export interface HistoryAccount {
  readonly path: string;
  messages: number;
  undated: number;
  unusable: number;
  /** The first few of the unusable ones. */
  readonly faults: Fault[];
  /** What the parser put on record, by code. */
  readonly defects: Record<string, number>;
}

export function openAccount(path: string): HistoryAccount {
  return { path, messages: 0, undated: 0, unusable: 0, faults: [], defects: {} };
}

/** Mail began in 1971; a time before that or after now is a mistake and would stand at the wrong end of the counts. */
const firstMailMs = Date.UTC(1971, 0, 1);

/** Parses the messages of a labelled history in its order, keeping account of what was found. */
export async function* readHistory(account: HistoryAccount, nowMs: number): AsyncGenerator<HistoryMessage> {
  for await (const each of readLabelled(account.path)) {
    if (each.kind === 'bad') {
      account.unusable += 1;
      if (account.faults.length < bounds.faultsListedMax) account.faults.push(each.fault);
      continue;
    }
    const { content } = each;
    const message = content.kind === 'mail' ? await parseMail(content.raw) : parseForm(content.json);
    const given = each.atMs ?? message.sentAtMs;
    const atMs = given !== null && given >= firstMailMs && given <= nowMs ? given : null;
    account.messages += 1;
    if (atMs === null) account.undated += 1;
    for (const code of new Set(message.defects.map((defect) => defect.code)))
      account.defects[code] = (account.defects[code] ?? 0) + 1;
    yield { label: each.label, atMs, message };
  }
}
