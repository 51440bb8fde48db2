/** Where things stand in a store. `message` below is the object key of the raw message without `inbound/`. */
export const keys = {
  desk: 'config/desk.json',
  tokenKey: 'config/token-key',
  inbound: 'inbound/',
  /** Labelled messages of earlier years, learned by a backfill: `inbound/archive/<queue>/…`. */
  archive: 'inbound/archive/',
  confirmations: 'confirmations/',
  /** Drops that can never be folded, each with what is wrong with it. Not below `confirmations/`, whose events fold. */
  refusedConfirmations: 'confirmations-refused/',
  histories: 'histories/',
  manifest: 'model/manifest.json',
  bases: 'model/bases/',
  tables: 'model/tables/',
  segments: 'model/segments/',
  absorbed: 'model/absorbed/',
  versions: 'model/versions/',
  orders: 'model/orders/',
  reports: 'reports/',
  /** Of the page for held messages: what a person can still take back, and links that were used. */
  settling: 'settling/',
  /** One mark for each message that the router left for a person, where the deployed page is in use: `waiting/<message>`. */
  waiting: 'waiting/',
  /** Ids of webhooks taken, kept a day: longer than their timestamps hold. */
  webhookMarks: 'webhook-marks/',
} as const;

/** Metadata by which a message carries the id of the request that brought it, from the intake through routing to its fold. */
export const traceMetadata = 'tallypost-trace';
