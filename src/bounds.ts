/** Every bound of the project, each with its reason. Units stand last in the name. */
export const bounds = {
  /** Largest raw message read: the receiving service accepts 40 MB with headers. */
  rawBytesMax: 40 * 1024 * 1024,
  /** Entries folded in one pass: two columns each keep (token, column) below 2^40 * 2^13 = 2^53, exact in a double. */
  foldEntriesMax: 4096,
  /** Messages whose leave-one-out scores exponents are fitted to: shared ones are known from two thousand, those of 77 queues
   *  gained 0.5 points of accuracy between four thousand and ten; beyond, compaction would only take longer. */
  fitMessagesMax: 12_000,
  /** Scores held for a fit, 4 bytes each: 96 MB of a function's memory. */
  fitScoresMax: 24_000_000,
  /** Size of a served table: at 8 queues 1.4 MB, which a cold function reads, checks and compiles in some 30 ms. */
  tableBytesPerQueueMax: 175_000,
  /** A desk of few queues may hold as much as one of this many. */
  tableQueuesMin: 8,
  /** Weeks for which a new token is held however little it tells yet. */
  newTokenEpochs: 8,
  /** Dropped tokens seen this often are listed in the table, lest a later entry take one for new; rarer ones are as good as new. */
  droppedSeenMin: 5,
  /** Messages of a queue before and since that drift is looked for in: fewer show it only when it is plain to everybody. */
  driftMessagesMin: 10,
  /** Messages of a queue that hold a token before it can tell of drift: rarer ones are new in any week. */
  driftSeenMin: 4,
  /** Tokens named for each finding of drift: enough to tell what happened. */
  driftTokensMax: 10,
  /** Of messages that hardly differ, under one queue in one week, this many count for routing: enough to learn them by, too few to
   *  drown what the queue was. */
  burstCountedMax: 20,
  /** Share of tokens in common that makes two messages one burst's: of 200, one word changed changes about 7. */
  burstLikenessMin: 0.8,
  /** Messages of fewer tokens ("please cancel my account") are alike without anybody's doing. */
  burstTokensMin: 40,
  /** Groups of alike messages looked for at once, a few KB each. */
  burstGroupsMax: 2_000,
  /** Groups at the cap kept from one night to the next. */
  burstGroupsKeptMax: 50,
  /** Different messages beyond the cap, some 30 bytes each in the table; more than these count after all. */
  burstMembersMax: 5_000,
  /** Scores that a scorer remembers for each region, 8 bytes each: 8 MB; the tokens that make up most of all mail. */
  rememberedScoresMax: 1_000_000,
  /** Ratios remembered for each queue and reading while a fit scores that queue's messages without themselves: 2 MB. */
  rememberedRatiosMax: 250_000,

  // Messages (src/message)
  /** Header fields of a part that are kept: real ones hold a few KB; 10,000 recipients would be 300 KB. */
  headerBytesMax: 512 * 1024,
  /** One header field, folded lines in all: room for about 2,000 recipients. */
  headerFieldBytesMax: 64 * 1024,
  /** Header of a part inside a multipart; beyond it the splitter stops. */
  partHeaderBytesMax: 256 * 1024,
  /** Headers of all parts together: decoding their file names costs up to 1 s a megabyte. */
  partHeadersBytesMax: 512 * 1024,
  /** Parts of one message: mail clients make fewer than 30. */
  partsMax: 100,
  /** Multipart inside multipart: clients reach 5 and each forwarding as attachment adds 2; every line that looks like a
   *  boundary is compared with the boundary of every level. */
  partDepthMax: 20,
  /** Encoded plain text read of one message, all parts together: 40,000 words. */
  textBytesMax: 256 * 1024,
  /** Encoded HTML read of one message: word processors wrap a page of text in 100 to 300 KB. */
  htmlBytesMax: 512 * 1024,
  /** Text before the first boundary, kept in case the boundary named is not the one used. */
  preambleBytesMax: 256 * 1024,
  /** Own working time of one parse, checked at each piece of 64 KB; the worst input known needs under 3 s. */
  parseMsMax: 5000,
  /** The raw message is split in pieces of this size, between which the deadline is checked. */
  parsePieceBytes: 64 * 1024,
  /** Decoded text of one message, in UTF-16 units: 10,000 words. */
  textCharsMax: 64 * 1024,
  /** RFC 5322 section 2.1.1: a line holds at most 998 characters. */
  subjectCharsMax: 998,
  /** Undecoded subject: an encoded word takes up to 4 times the characters that it holds. */
  subjectBytesMax: 8 * 1024,
  /** RFC 5321 section 4.5.3.1.8 asks for 100 recipients at least. */
  recipientsMax: 100,
  /** RFC 5321 section 4.5.3.1: 64 of local part, 255 of domain and the @ sign. */
  addressCharsMax: 320,
  /** RFC 5321 section 6.3: over 100 Received fields mean a loop. */
  receivedMax: 100,
  /** Open elements of HTML that are followed; a browser's parser flattens deeper ones too (512). */
  htmlDepthMax: 512,
  /** Style sheet text read of one message, and rules kept of it. */
  styleCharsMax: 64 * 1024,
  styleRulesMax: 500,
  /** Value of one HTML attribute that is looked at. */
  attributeCharsMax: 2048,
  /** A line longer than this opens no quotation or signature. */
  replyLineCharsMax: 500,
  /** Defects on record of one message; beyond it they repeat. */
  defectsMax: 50,
  /** JSON of one form: far above what a web form takes. */
  formBytesMax: 1024 * 1024,
  /** Fields of one form, and characters of a field's name. */
  formFieldsMax: 200,
  fieldNameCharsMax: 100,

  // Features (src/features)
  /** Text that tokens are drawn from: about 10,000 words, far beyond any request to a desk; bounds the time of a flood. */
  featureCharsMax: 64 * 1024,
  /** Longer runs are not words (base64, keys): the longest words of running text in any language stay below. */
  wordCharsMax: 40,
  /** The dictionary segmenter grows faster than its input; slices of this size keep it linear. */
  segmentCharsMax: 256,
  /** Letters of a gram. */
  gramChars: 4,
  /** Distinct tokens kept of one message, the first in reading order. Of 3,278 long posts 99 % hold at most 700 words,
   *  1,560 pairs and 2,360 grams; a message then weighs at most 50 KB in its history. */
  subjectTokensMax: 64,
  wordTokensMax: 1024,
  pairTokensMax: 2048,
  gramTokensMax: 3072,
  /** Words, and grams, whose hashes are held in memory between messages: about 15 MB. */
  rememberedWordsMax: 64 * 1024,

  // Labelled histories (src/cli/labelled)
  /** A JSON line holds one raw message, at worst with an escape of two characters for every line end and quote. */
  labelledLineBytesMax: 64 * 1024 * 1024,
  /** A CSV row holds one form; far above any text a form takes, so that an unclosed quote ends early. */
  csvRecordCharsMax: 8 * 1024 * 1024,
  /** Mail stores nest by year and month; deeper is a loop of links. */
  labelledFolderDepthMax: 8,
  /** Faults of a history that are listed one by one; the rest is only counted. */
  faultsListedMax: 20,

  // Stores (src/store)
  /** Amazon S3 User Guide, "Naming Amazon S3 objects": 1,024 bytes of UTF-8. */
  keyBytesMax: 1024,
  /** Amazon S3 User Guide, "Working with object metadata": 2 KB of user metadata, keys and values. */
  metadataBytesMax: 2048,
  /** A streamed body comes in pieces of at most this size. */
  streamChunkBytesMax: 256 * 1024,
  /** Directory store: characters of an encoded key kept in one file name, 3 bytes each at worst; file systems take 255 bytes. */
  nameUnitsMax: 80,
  /** Directory store: ids of predecessors kept in a version's header, by which a slow writer finds that it had won. */
  lineageMax: 16,
  /** Directory store: times an unconditional write starts again when others write the same key. */
  directoryAttemptsMax: 1000,
  /** Directory store: temporary files of crashed processes are swept after this; no write takes nearly as long. */
  temporaryAgeMsMax: 60 * 60 * 1000,
  /** Directory store: what stands for a deleted object is swept after this; no process stalls so long between two calls, and
   *  listings of a busy folder do not have to pass over a day's deletions. */
  tombstoneAgeMsMax: 10 * 60 * 1000,

  // The desk's file (src/desk). A desk that needs more of any is better served by two desks.
  /** All lists below filled with short items fit; read at every cold start. */
  deskBytesMax: 1024 * 1024,
  /** Ten times the largest desk measured; a score costs one addend a queue and token. */
  queuesMax: 1000,
  /** Shown in one line. */
  titleCharsMax: 200,
  /** Two months of staff time: beyond it a typing error is likelier. */
  costMinutesMax: 100_000,
  /** Values of one slot: each costs a count in every column of the table. */
  ownAddressesMax: 200,
  domainsMax: 1000,
  senderClassesMax: 50,
  /** Each is one search through the text. */
  referencesMax: 50,
  patternCharsMax: 40,
  formsMax: 200,
  fieldsMax: 200,
  choicesMax: 200,
  choiceCharsMax: 200,
  /** All phrases together are looked up by their first word, so a message costs its own length. */
  guardsMax: 200,
  phrasesMax: 500,
  phraseCharsMax: 200,
  sendersMax: 1000,
  /** Phrases looked for by one expression: its time grows with their number. */
  guardPhrasesMax: 64,

  // Ledger (src/ledger)
  /** Superseded objects stay this long: longer than any delivery is retried (SQS keeps a message 14 days at most). */
  horizonMs: 15 * 24 * 3600 * 1000,
  /** A claim being folded by another process is left to it for this long before it is taken over: a batch takes seconds. */
  foldPatienceMs: 20_000,
  /** Confirmations dated further ahead than a clock can be wrong would become the newest week and age all others. */
  confirmedAheadMsMax: 24 * 3600 * 1000,
  /** Rounds of one batch: each ends with its segment committed, or with it voided by another process. */
  foldRoundsMax: 6,
  /** Attempts at one compare-and-set, a pause before each but the first; after that the delivery is left to be repeated. */
  writeAttemptsMax: 12,
  /** First and longest pause between attempts; each is drawn at random up to its length. */
  pauseMsMin: 20,
  pauseMsMax: 2_000,
  /** Requests of one batch under way at the same time. */
  requestsAtOnceMax: 16,
  /** Confirmations of one message: far above any real dispute, so that a loop between two systems ends. */
  confirmationsPerMessageMax: 500,
  /** Manifests and histories are small; a larger object is not ours. */
  ledgerJsonBytesMax: 8 * 1024 * 1024,
  /** Ids of absorbed segments, 23 bytes each: one batch a minute for five years. */
  absorbedBytesMax: 64 * 1024 * 1024,
  /** Bases, tables and segments are read whole; a base of a million short messages takes a sixth of it. */
  modelBytesMax: 512 * 1024 * 1024,
  /** Messages drawn from the histories for fitting: enough for stable exponents, a bounded night's work. */
  fitSampleMax: 2_000,
  /** Contradicted confirmations and changed queues listed in a compaction's result: more than anyone looks at in a day. */
  findingsListedMax: 40,
  /** Drift compares the newest weeks with those before: two, so that one quiet week is not all there is. */
  driftRecentEpochs: 2,
  /** Histories counted at a time by a recount. */
  recountChunkMax: 500,
  /** Attempts at a recount, a pause before each but the first. One for a new schema must find a gap between two folds that is as
   *  long as itself: where none of eight does, the next eight would hardly. */
  recountAttemptsMax: 8,

  // Intake over HTTPS (src/intake)
  /** A long letter typed into a form is under 20 KB; all fields of one submission together. */
  intakeFormBytesMax: 64 * 1024,
  /** Helpdesks send the whole case with its last remarks; a function URL takes 6 MB. */
  intakeWebhookBytesMax: 256 * 1024,
  /** A submission is one flat object. */
  intakeJsonDepthMax: 2,
  /** Deep enough for any case document seen in published examples; far below what exhausts a stack. */
  intakeWebhookDepthMax: 32,
  /** Faults listed in one problem body. */
  intakeFaultsMax: 20,
  /** Standard Webhooks suggests short unique ids; longer ones are not ids. */
  webhookIdCharsMax: 256,
  /** An object key has 1,024 bytes; the prefixes before a message's id take under 100. */
  messageIdCharsMax: 900,
  /** A person's name or address, a queue's name, a time. */
  confirmationLineCharsMax: 200,

  // Metrics (src/metrics)
  /** Queues told apart in metrics: each is a metric that is paid for by the month, and a dashboard shows no more. */
  metricQueuesMax: 20,
  /** Amazon CloudWatch User Guide, "Specification: Embedded metric format": values of one metric in one document. */
  emfValuesMax: 100,

  // Handlers (src/handlers)
  /** The desk's file is looked at again after this: a change acts within a minute, a batch costs no request for it. */
  deskFreshMs: 60_000,
  /** A message is replaced while it is being routed only by a person's hand: once more is enough, and one to spare. */
  routeAttemptsMax: 3,
  /** A confirmation takes 200 bytes; of what is no confirmation so much is kept beside the reason. */
  dropBytesMax: 64 * 1024,
  /** Drops folded in one batch, and so in one segment, by compaction and by the local runner. */
  foldDropsMax: 500,
  /** Lambda's retries of a drop's own event end well before: five deliveries of six timeouts each. */
  leftDropAgeMs: 60 * 60 * 1000,
  /** Local runner: messages routed in one batch, with one look at the model. */
  localRouteBatchMax: 100,
  /** Local runner: each segment beside the base is read at every start and added to the table at every change. */
  localSegmentsMax: 20,
  /** Local runner: pause between rounds when it follows. */
  localPauseMs: 2_000,
  /** Drops taken up by one compaction; the rest is left to the next. */
  leftDropsMax: 20_000,
  /** Histories that the compact function recounts: sixteen reads at a time of some 20 ms leave half of its 15 minutes. */
  functionRecountMax: 400_000,

  // Report (src/report)
  /** Newest messages looked at one by one: a month of a busy desk, two small reads each, a minute at most. */
  reportMessagesMax: 5_000,
  /** Of them, those scored again without themselves for a second look: a few seconds. */
  secondLookMessagesMax: 2_000,
  /** More than this nobody looks at in a morning. */
  secondLookListedMax: 40,
  /** Held messages compared pair by pair for a new queue: 20,000 pairs, about a second. */
  groupedMessagesMax: 200,
  newQueuesListedMax: 5,
  /** Messages larger than this are not opened for their words: sixteen are read at a time, in the memory of one function. */
  reportReadBytesMax: 4 * 1024 * 1024,
  /** Messages read to find the words behind the hashes of one queue. */
  wordsReadMax: 40,

  // The page for held messages (src/settle)
  /** A link is for one person to come in with, once; a working day later it is stale. */
  settleLinkMs: 24 * 3600 * 1000,
  /** A link to the deployed page may lie in a mailbox over a weekend, not for longer. */
  settleLinkHoursMax: 72,
  /** Of the secret that signs links to the deployed page: 32 letters and digits are 190 bits. */
  settleSecretCharsMin: 32,
  /** A person stays in for a working day. */
  settleSessionMs: 12 * 3600 * 1000,
  /** What was settled and could still be taken back is dropped for good when nothing follows. */
  settleUndoMs: 10 * 60 * 1000,
  /** Body of a request of the page: a message's id, a queue and a token. */
  settleBodyBytesMax: 8 * 1024,
  /** Messages listed on the page; whoever settles these sees the next ones. */
  settleListedMax: 200,
  /** Messages up to this size are read sixteen at a time for their titles; larger ones one by one, at up to 125 MB of memory. */
  settleSmallBytesMax: 1024 * 1024,
  /** Marks of waiting messages looked at for one page, of which the first may be settled long since: two seconds of reads. */
  settleMarksReadMax: 2_000,
  /** Marks of used tokens taken away at a time, so that nobody waits for it. */
  settleSweptMax: 200,
  /** Words marked in one message, and rows of evidence beside it: more would not be read. */
  settleMarksMax: 300,
  settleEvidenceMax: 8,
} as const;
