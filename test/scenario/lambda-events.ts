import { createHash } from 'node:crypto';
import type { Sample } from './samples.ts';

/** Event JSON as the services deliver it: S3 notifications inside SQS records, direct, and the schedule. */

const bucket = 'fenmark-mail';
const region = 'eu-west-2';
const account = '000000000000';

/** Keys in notifications are form-encoded: a space is `+`, everything else percent-encoded, `/` stays. */
export function formEncodedKey(key: string): string {
  return key
    .split('/')
    .map((part) => encodeURIComponent(part).replace(/%20/g, '+'))
    .join('/');
}

export function s3Event(key: string, bytes: Uint8Array, at: string, sequence: number): unknown {
  return {
    Records: [
      {
        eventVersion: '2.1',
        eventSource: 'aws:s3',
        awsRegion: region,
        eventTime: at,
        eventName: 'ObjectCreated:Put',
        userIdentity: { principalId: 'AWS:EXAMPLE' },
        requestParameters: { sourceIPAddress: '192.0.2.10' },
        responseElements: { 'x-amz-request-id': `EXAMPLE${sequence}`, 'x-amz-id-2': 'example' },
        s3: {
          s3SchemaVersion: '1.0',
          configurationId: 'inbound',
          bucket: { name: bucket, ownerIdentity: { principalId: 'EXAMPLE' }, arn: `arn:aws:s3:::${bucket}` },
          object: {
            key: formEncodedKey(key),
            size: bytes.length,
            eTag: createHash('md5').update(bytes).digest('hex'),
            sequencer: sequence.toString(16).toUpperCase().padStart(16, '0'),
          },
        },
      },
    ],
  };
}

export function sqsEvent(bodies: readonly unknown[], queue: string, atMs: number): unknown {
  return {
    Records: bodies.map((body, i) => {
      const text = JSON.stringify(body);
      return {
        messageId: `00000000-0000-4000-8000-${String(i + 1).padStart(12, '0')}`,
        receiptHandle: `receipt-${i + 1}`,
        body: text,
        attributes: {
          ApproximateReceiveCount: '1',
          SentTimestamp: String(atMs + i),
          SenderId: 'EXAMPLE',
          ApproximateFirstReceiveTimestamp: String(atMs + i + 20),
        },
        messageAttributes: {},
        md5OfBody: createHash('md5').update(text).digest('hex'),
        eventSource: 'aws:sqs',
        eventSourceARN: `arn:aws:sqs:${region}:${account}:${queue}`,
        awsRegion: region,
      };
    }),
  };
}

/** All files of events/ but the desk's own: path to text or bytes. */
export function eventFiles(samples: readonly Sample[]): Map<string, Uint8Array> {
  const files = new Map<string, Uint8Array>(samples.map(({ name, bytes }) => [`messages/${name}`, bytes]));
  const json = (value: unknown) => Buffer.from(`${JSON.stringify(value, null, 2)}\n`);
  const first = samples[0] as Sample;
  const drops = samples.slice(0, 2).map(({ message }, i) => {
    const said = message.confirmations[0] ?? {
      queue: message.trueQueue,
      by: 'a.tolland',
      atMs: message.arrivesAtMs + 3600_000,
    };
    const drop = {
      message: message.key.slice('inbound/'.length),
      queue: said.queue,
      by: said.by,
      at: new Date(said.atMs).toISOString(),
    };
    return { key: `confirmations/drop ${i + 1}.json`, bytes: json(drop), at: drop.at, atMs: said.atMs };
  });
  const arrived = (sample: Sample, i: number) =>
    s3Event(sample.message.key, sample.bytes, new Date(sample.message.arrivesAtMs).toISOString(), i + 1);
  files.set('confirmation.json', (drops[0] as (typeof drops)[number]).bytes);
  files.set(
    'route-sqs.json',
    json(sqsEvent(samples.slice(0, 3).map(arrived), 'tallypost-route', first.message.arrivesAtMs)),
  );
  files.set('route-s3.json', json(arrived(first, 0)));
  files.set(
    'confirm-sqs.json',
    json(
      sqsEvent(
        drops.map((drop, i) => s3Event(drop.key, drop.bytes, drop.at, i + 11)),
        'tallypost-confirm',
        (drops[0] as (typeof drops)[number]).atMs,
      ),
    ),
  );
  files.set(
    's3-test-sqs.json',
    json(
      sqsEvent(
        [{ Service: 'Amazon S3', Event: 's3:TestEvent', Time: '2026-01-05T08:00:00.000Z', Bucket: bucket }],
        'tallypost-route',
        first.message.arrivesAtMs,
      ),
    ),
  );
  files.set(
    'compact-schedule.json',
    json({
      version: '0',
      id: '00000000-0000-4000-8000-000000000099',
      'detail-type': 'Scheduled Event',
      source: 'aws.events',
      account,
      time: '2026-03-02T02:00:00Z',
      region,
      resources: [`arn:aws:events:${region}:${account}:rule/tallypost-nightly`],
      detail: {},
    }),
  );
  return files;
}
