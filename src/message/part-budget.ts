import { Buffer } from 'node:buffer';
import { bounds } from '../bounds.ts';
import type { Defects } from './defects.ts';
import { isTextType, type Part } from './part.ts';

/** Encoded bytes that may still be kept, for the whole message. */
export interface Budget {
  textBytes: number;
  htmlBytes: number;
  /** Text marked as attachment, kept for mail that has no other text; apart, so that it cannot starve the body. */
  attachedBytes: number;
}

export function openBudget(): Budget {
  return {
    textBytes: bounds.textBytesMax,
    htmlBytes: bounds.htmlBytesMax,
    attachedBytes: bounds.textBytesMax,
  };
}

/** Counts the bytes of a body and keeps those of text while the budget lasts. */
export function keepBody(part: Part, bytes: Buffer, budget: Budget, defects: Defects): void {
  part.bytes += bytes.length;
  if (!isTextType(part.contentType)) return;
  const purse =
    part.disposition === 'attachment'
      ? 'attachedBytes'
      : part.contentType === 'text/html'
        ? 'htmlBytes'
        : 'textBytes';
  const room = budget[purse];
  // A copy: the piece belongs to a larger buffer that would otherwise stay alive.
  if (room > 0) part.pieces.push(Buffer.from(bytes.subarray(0, room)));
  const kept = Math.min(room, bytes.length);
  part.bytesKept += kept;
  budget[purse] -= kept;
  if (kept < bytes.length && purse !== 'attachedBytes') {
    defects.add(purse === 'htmlBytes' ? 'html-cut' : 'text-cut', part.number);
  }
}
