/** A bounded, parsed message: what the rest of the program may look at. Values only. */

/** Something that was wrong with a message or a bound that it reached; on record, never a failure. */
export interface Defect {
  /** Stable, kebab-case, e.g. `text-cut`, `date-unreadable`. */
  readonly code: string;
  /** Where: a header name, a part number such as `1.2`, a field name. Never the customer's text. */
  readonly place: string;
}

export interface Address {
  /** addr-spec of RFC 5322, lower-cased; local part and domain. */
  readonly address: string;
  /** Domain, lower-cased, in ASCII (IDNA) form; empty when there is none. */
  readonly domain: string;
}

export type AttachmentKind =
  | 'image'
  | 'pdf'
  | 'document'
  | 'sheet'
  | 'archive'
  | 'calendar'
  | 'audio'
  | 'video'
  | 'message'
  | 'signature'
  | 'other';

export interface Attachment {
  readonly kind: AttachmentKind;
  /** Encoded size as received. */
  readonly bytes: number;
}

export type Verdict = 'pass' | 'fail' | 'gray' | 'failed' | 'missing';

/** Header facts that routing may use. */
export interface HeaderFacts {
  /** In-Reply-To or References present (RFC 5322 section 3.6.4). */
  readonly isReply: boolean;
  /** Auto-Submitted other than `no` (RFC 3834 section 5), or a null return path. */
  readonly isAutomatic: boolean;
  /** List-Id present (RFC 2919). */
  readonly isList: boolean;
  /** multipart/report; report-type=delivery-status (RFC 3464). */
  readonly isDeliveryReport: boolean;
  /** The receiving service's verdicts. */
  readonly spam: Verdict;
  readonly virus: Verdict;
}

export interface Form {
  readonly id: string;
  /** Field name to value, both bounded strings, in the order submitted. */
  readonly fields: Readonly<Record<string, string>>;
}

export interface Message {
  readonly channel: 'mail' | 'form';
  /** Message-ID without angle brackets; empty when absent. */
  readonly messageId: string;
  readonly from: Address | null;
  /** To, then Cc, then Delivered-To; bounded. */
  readonly recipients: readonly Address[];
  /** Decoded (RFC 2047), white space folded. */
  readonly subject: string;
  /** All text of the message, decoded, line ends as \n, bounded. For a form: its free-text fields joined by blank lines. */
  readonly text: string;
  /** What this writer wrote: `text` without reply history, forwarded copies and signatures; never empty while `text` is not. */
  readonly ownText: string;
  readonly attachments: readonly Attachment[];
  readonly facts: HeaderFacts;
  /** The Date header or the form's time, ms since the epoch UTC; null when absent or unreadable. */
  readonly sentAtMs: number | null;
  readonly form: Form | null;
  readonly defects: readonly Defect[];
}
