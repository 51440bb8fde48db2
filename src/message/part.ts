import type { Buffer } from 'node:buffer';
import libmime from 'libmime';

/** A node of the MIME tree (RFC 2045 to 2049) with what was kept of its body. */
export interface Part {
  /** 1 for the message itself, 1.2 for its second part. */
  readonly number: string;
  readonly parent: Part | null;
  readonly depth: number;
  /** Lower-cased, `text/plain` when absent or unreadable. */
  readonly contentType: string;
  /** Parameters of Content-Type, names lower-cased. */
  readonly params: Readonly<Record<string, string>>;
  readonly charset: string;
  readonly transferEncoding: string;
  readonly disposition: string;
  readonly fileName: string;
  /** Subject of an embedded message's root, undecoded; empty otherwise. */
  readonly subject: string;
  readonly children: Part[];
  /** Encoded body as received, bounded; empty for attachments. */
  readonly pieces: Buffer[];
  bytesKept: number;
  /** Encoded size as received, whole. */
  bytes: number;
}

export interface PartHead {
  readonly contentType: string;
  readonly transferEncoding: string;
  readonly disposition: string;
  readonly subject: string;
}

/** Reads the MIME fields of a part; values as received, one character a byte or decoded. */
export function openPart(number: string, parent: Part | null, head: PartHead): Part {
  const type = readParameters(head.contentType);
  const disposition = readParameters(head.disposition);
  const contentType = type.value.toLowerCase();
  const isAttachment = disposition.value.toLowerCase() === 'attachment';
  return {
    number,
    parent,
    depth: parent === null ? 0 : parent.depth + 1,
    contentType: /^[^\s/]+\/[^\s/]+$/.test(contentType)
      ? contentType
      : head.contentType === '' && isAttachment
        ? 'application/octet-stream'
        : 'text/plain',
    params: type.params,
    charset: (type.params.charset ?? '').trim(),
    transferEncoding: stripComments(head.transferEncoding).trim().toLowerCase(),
    disposition: disposition.value.toLowerCase(),
    fileName: (disposition.params.filename ?? type.params.name ?? '').slice(0, 255),
    subject: head.subject,
    children: [],
    pieces: [],
    bytesKept: 0,
    bytes: 0,
  };
}

/** A text part that a reader shows in place. */
export function isShownText(part: Part): boolean {
  return isTextType(part.contentType) && part.disposition !== 'attachment';
}

/** Types whose body is text for people; other text/* types (csv, calendar, vcard, rtf) are files. */
export function isTextType(contentType: string): boolean {
  return (
    contentType === 'text/plain' ||
    contentType === 'text/html' ||
    contentType === 'text/enriched' ||
    contentType === 'text/richtext' ||
    contentType === 'text/markdown' ||
    contentType === 'message/delivery-status' ||
    contentType === 'message/disposition-notification' ||
    contentType === 'text/rfc822-headers'
  );
}

export function isMultipart(part: Part): boolean {
  return part.contentType.startsWith('multipart/');
}

interface Parameters {
  readonly value: string;
  readonly params: Readonly<Record<string, string>>;
}

function readParameters(value: string): Parameters {
  if (value === '') return { value: '', params: {} };
  try {
    const parsed = libmime.parseHeaderValue(value, { stripComments: true });
    return { value: (parsed.value ?? '').trim(), params: parsed.params ?? {} };
  } catch {
    return { value: value.split(';', 1)[0]!.trim(), params: {} };
  }
}

/** RFC 2045 section 6.1 allows comments in structured fields; this field holds nothing but a token. */
function stripComments(value: string): string {
  const start = value.indexOf('(');
  return start < 0 ? value : value.slice(0, start);
}
