import { Buffer } from 'node:buffer';
import { visit } from './attachments.ts';
import type { Defects } from './defects.ts';
import { isMultipart, type Part } from './part.ts';
import { readParts } from './read-parts.ts';

/** Finds the parts of a multipart whose boundary parameter is missing or wrong: the boundary is then the first line
 *  that looks like one before a part's header. Without such a line the body counts as text. */
export async function rescueParts(root: Part, defects: Defects): Promise<void> {
  const lost: Part[] = [];
  visit(root, (part) => {
    if (isMultipart(part) && part.children.length === 0 && part.pieces.length > 0) lost.push(part);
  });
  for (const part of lost) {
    const body = Buffer.concat(part.pieces);
    const boundary = guessBoundary(body);
    if (boundary === null) {
      defects.add('boundary-missing', part.number);
      continue;
    }
    defects.add('boundary-guessed', part.number);
    const head = Buffer.from(`Content-Type: multipart/mixed; boundary="${boundary}"\r\n\r\n`, 'latin1');
    const read = await readParts(Buffer.concat([head, body]), defects);
    part.children.push(...read.root.children);
    part.pieces.length = 0;
  }
}

function guessBoundary(body: Buffer): string | null {
  // RFC 2046 section 5.1.1: up to 70 characters; quotes and backslashes are left out as they would need escaping.
  const text = body.toString('latin1', 0, 64 * 1024);
  return /^--([\w'()+,./:=?-]{1,70})[ \t]*\r?\n(?:content-[a-z-]{1,40}:|\r?\n)/im.exec(text)?.[1] ?? null;
}
