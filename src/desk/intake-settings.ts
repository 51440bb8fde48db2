/** The desk's settings of the HTTPS intake. Values only. */

export interface IntakeField {
  readonly name: string;
  readonly isRequired: boolean;
  readonly charactersMax: number;
  /** Closed list; null: free text. */
  readonly values: readonly string[] | null;
}

export interface IntakeForm {
  readonly id: string;
  readonly fields: readonly IntakeField[];
  /** The field that holds the sender's e-mail address; null: none. */
  readonly senderField: string | null;
  /** A field hidden from people: a filled one marks a machine; null: none. */
  readonly trapField: string | null;
  /** A field with the time at which the page was shown, ms since the epoch; null: none. */
  readonly shownAtField: string | null;
  /** Sent sooner after that than a person can type: a machine. */
  readonly secondsMin: number;
  /** What becomes of a submission that looks machine-made: `hold` stores it for a person, `refuse` answers 422. */
  readonly onSuspect: 'hold' | 'refuse';
  /** Where a browser is sent after a form-encoded post (303); null: a JSON answer. */
  readonly thanksUrl: string | null;
}

/** Where a helpdesk's own JSON holds the members of a confirmation: JSON Pointers (RFC 6901). */
export interface ConfirmationMapping {
  readonly message: string;
  readonly queue: string;
  readonly by: string;
  readonly at: string;
  /** The helpdesk's name of a queue to ours; a name that is not listed must be one of our ids. */
  readonly queueNames: Readonly<Record<string, string>>;
}

export interface IntakeSettings {
  /** Origins (RFC 6454) whose pages may post, e.g. `https://www.fenmarkwater.example`. */
  readonly origins: readonly string[];
  readonly forms: readonly IntakeForm[];
  readonly confirmations: ConfirmationMapping;
}
