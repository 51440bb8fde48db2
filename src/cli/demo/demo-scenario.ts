/** What a demo is played from: invented messages with what truly became of them. Made outside of the program. */

export interface DemoConfirmation {
  readonly queue: string;
  readonly by: string;
  readonly atMs: number;
}

export interface DemoMessage {
  /** Object key, `inbound/` included. */
  readonly key: string;
  readonly bytes: Uint8Array;
  readonly contentType: string;
  readonly arrivesAtMs: number;
  readonly trueQueue: string;
  /** In order of time; the last one is right. */
  readonly confirmations: readonly DemoConfirmation[];
}

export interface DemoScenario {
  /** In order of arrival. */
  readonly messages: readonly DemoMessage[];
  /** Queues that open after the start; before that another one gets their mail. */
  readonly openings: readonly { readonly queue: string; readonly atMs: number; readonly before: string }[];
  /** A period in which customers use new words for known matters. */
  readonly campaign: { readonly fromMs: number; readonly toMs: number };
}
