import { TallypostError } from '../errors.ts';

/** One object that an event says was written. */
export interface EventObject {
  /** Key within the store: decoded, the desk's prefix taken off. */
  readonly key: string;
  /** Follows the message through metadata and logs to its fold. */
  readonly trace: string;
}

/** One delivery: an SQS message, or a whole direct S3 event. */
export interface Delivery {
  /** SQS message id, by which a failed delivery is named; null for a direct event. */
  readonly receipt: string | null;
  readonly objects: readonly EventObject[];
  /** Why the delivery could not be understood; it must be delivered again, and so end among the dead letters. */
  readonly fault: TallypostError | null;
}

type Json = Readonly<Record<string, unknown>>;

/** What an invocation delivers: SQS messages whose bodies are S3 events, or one S3 event.
 *  Source: Amazon S3 User Guide, "Event message structure" (version 2.x): keys are form-encoded. */
export function deliveriesOf(event: unknown, prefix: string): Delivery[] {
  const records = recordsOf(event);
  if (records === null) return [deliveryOf(null, event, 'event', prefix)];
  if (!records.some((record) => textIn(record, 'eventSource') === 'aws:sqs')) {
    return [deliveryOf(null, event, 'event', prefix)];
  }
  return records.map((record, i) => {
    const receipt = textIn(record, 'messageId') ?? '';
    let body: unknown;
    try {
      body = JSON.parse(textIn(record, 'body') ?? '');
    } catch {
      // Left undefined: no S3 event either.
    }
    return deliveryOf(receipt, body, `event#/Records/${i}/body`, prefix);
  });
}

function deliveryOf(receipt: string | null, body: unknown, place: string, prefix: string): Delivery {
  // S3 sends this once when a notification is set up; it is no object.
  if (isJson(body) && body.Event === 's3:TestEvent') return { receipt, objects: [], fault: null };
  const objects: EventObject[] = [];
  const records = recordsOf(body);
  if (records === null)
    return { receipt, objects, fault: notUnderstood(place, 'Records of an S3 event', 'none') };
  for (const [i, record] of records.entries()) {
    const version = textIn(record, 'eventVersion') ?? '';
    // Minor versions add members and take none away.
    if (!version.startsWith('2.')) {
      return {
        receipt,
        objects: [],
        fault: notUnderstood(`${place}/Records/${i}/eventVersion`, '2.x', version || 'nothing'),
      };
    }
    const name = textIn(record, 'eventName') ?? '';
    if (!name.startsWith('ObjectCreated:')) continue;
    const key = keyOf(record);
    if (key === null) {
      return {
        receipt,
        objects: [],
        fault: notUnderstood(`${place}/Records/${i}/s3/object/key`, 'a form-encoded key', 'none'),
      };
    }
    const within = withoutPrefix(key, prefix);
    if (within !== null) objects.push({ key: within, trace: traceOf(record, receipt) });
  }
  return { receipt, objects, fault: null };
}

function keyOf(record: Json): string | null {
  const s3 = record.s3;
  const object = isJson(s3) ? s3.object : undefined;
  const key = isJson(object) ? textIn(object, 'key') : null;
  if (key === null || key === '') return null;
  try {
    return decodeURIComponent(key.replaceAll('+', ' '));
  } catch {
    return null;
  }
}

/** Null for an object outside of this desk: another desk of the same bucket has its own functions. */
function withoutPrefix(key: string, prefix: string): string | null {
  if (prefix === '') return key;
  return key.startsWith(`${prefix}/`) ? key.slice(prefix.length + 1) : null;
}

/** The id of the request that wrote the object, which S3's own logs show too; else that of the delivery. */
function traceOf(record: Json, receipt: string | null): string {
  const elements = record.responseElements;
  const id = isJson(elements) ? textIn(elements, 'x-amz-request-id') : null;
  const trace = id ?? receipt ?? '';
  return /^[\x21-\x7e]{1,64}$/.test(trace) ? trace : '';
}

function recordsOf(event: unknown): readonly Json[] | null {
  const records = isJson(event) ? event.Records : undefined;
  return Array.isArray(records) && records.every(isJson) ? records : null;
}

function isJson(value: unknown): value is Json {
  return typeof value === 'object' && value !== null;
}

function textIn(object: Json, member: string): string | null {
  const value = object[member];
  return typeof value === 'string' ? value : null;
}

function notUnderstood(place: string, expected: string, got: string): TallypostError {
  return new TallypostError({ code: 'event-not-understood', place, expected, got });
}
