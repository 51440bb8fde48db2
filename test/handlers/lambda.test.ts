import { Readable } from 'node:stream';
import {
  CopyObjectCommand,
  GetObjectCommand,
  type GetObjectCommandOutput,
  HeadObjectCommand,
  S3Client,
} from '@aws-sdk/client-s3';
import { mockClient } from 'aws-sdk-client-mock';
import { afterEach, describe, expect, it, vi } from 'vitest';
import { exampleDesk } from '../features/example.ts';

const s3 = mockClient(S3Client);
/** As the SDK gives a body: a stream that can also be read whole. */
const bodyOf = (text: string) => {
  const whole = { transformToByteArray: async () => new Uint8Array(Buffer.from(text)) };
  return Object.assign(
    Readable.from([Buffer.from(text)]),
    whole,
  ) as unknown as GetObjectCommandOutput['Body'] & {};
};
const notFound = Object.assign(new Error('NotFound'), {
  name: 'NoSuchKey',
  $metadata: { httpStatusCode: 404 },
});

afterEach(() => {
  s3.reset();
  vi.unstubAllEnvs();
  vi.restoreAllMocks();
  vi.resetModules();
});

function settings(): void {
  vi.stubEnv('TALLYPOST_BUCKET', 'fenmark-mail');
  vi.stubEnv('TALLYPOST_PREFIX', 'desks/water/');
  vi.stubEnv('TALLYPOST_TOKEN_KEY', '000102030405060708090a0b0c0d0e0f');
  vi.stubEnv('AWS_REGION', 'eu-west-2');
}

const event = {
  Records: [
    {
      messageId: 'm1',
      eventSource: 'aws:sqs',
      body: JSON.stringify({
        Records: [
          {
            eventVersion: '2.1',
            eventName: 'ObjectCreated:Put',
            responseElements: { 'x-amz-request-id': 'REQ1' },
            s3: { object: { key: 'desks/water/inbound/a+b' } },
          },
        ],
      }),
    },
  ],
};

describe('the route function', () => {
  it('reads its settings, routes what an SQS batch names, and writes a line of log and one of metrics without any text', async () => {
    settings();
    const written: string[] = [];
    vi.spyOn(process.stdout, 'write').mockImplementation((line) => written.push(String(line)) > 0);
    s3.on(GetObjectCommand).rejects(notFound);
    s3.on(GetObjectCommand, { Key: 'desks/water/config/desk.json' }).resolves({
      Body: bodyOf(JSON.stringify(exampleDesk)),
      ETag: '"d"',
    });
    const mail = 'From: ana@home.test\r\nSubject: Question\r\n\r\nMy bill\r\n';
    const head = {
      ETag: '"e1"',
      ContentLength: mail.length,
      ContentType: 'message/rfc822',
      Metadata: { kept: 'yes' },
    };
    s3.on(GetObjectCommand, { Key: 'desks/water/inbound/a b' }).resolves({ ...head, Body: bodyOf(mail) });
    s3.on(HeadObjectCommand).resolves(head);
    s3.on(CopyObjectCommand).resolves({ CopyObjectResult: { ETag: '"e1"' } });

    const { handler } = await import('../../src/handlers/lambda/route.ts');
    expect(await handler(event)).toEqual({ batchItemFailures: [] });

    expect(s3.commandCalls(CopyObjectCommand)[0]!.args[0].input).toEqual({
      Bucket: 'fenmark-mail',
      Key: 'desks/water/inbound/a b',
      CopySource: 'fenmark-mail/desks/water/inbound/a%20b',
      CopySourceIfMatch: '"e1"',
      IfMatch: '"e1"',
      MetadataDirective: 'REPLACE',
      ContentType: 'message/rfc822',
      Metadata: {
        kept: 'yes',
        'tallypost-decision': 'held',
        'tallypost-reason': 'nothing-learned',
        'tallypost-model': '0',
        'tallypost-schema': expect.stringMatching(/^[0-9a-f]{16}$/),
        'tallypost-at': expect.stringMatching(/^\d{4}-\d\d-\d\dT/),
        'tallypost-trace': 'REQ1',
      },
    });
    expect(written).toHaveLength(2);
    expect(JSON.parse(written[0]!)).toMatchObject({
      level: 'info',
      event: 'held',
      reason: 'nothing-learned',
      message: 'a b',
      trace: 'REQ1',
    });
    expect(JSON.parse(written[1]!)).toMatchObject({
      _aws: { CloudWatchMetrics: [{ Namespace: 'Tallypost', Dimensions: [['Desk']] }] },
      Desk: 'fenmark-mail/desks/water',
      Routed: 0,
      Held: 1,
      Failed: 0,
    });
    expect(written.join('')).not.toContain('bill');
  });

  it('asks once more for what it failed to start with', async () => {
    settings();
    vi.stubEnv('TALLYPOST_TOKEN_KEY', '');
    s3.on(GetObjectCommand).rejects(notFound);
    const { handler } = await import('../../src/handlers/lambda/route.ts');
    const noKey = { code: 'token-key-missing', place: 's3://fenmark-mail/desks/water/config/token-key' };
    await expect(handler(event)).rejects.toMatchObject(noKey);
    await expect(handler(event)).rejects.toMatchObject(noKey);
    expect(s3.commandCalls(GetObjectCommand)).toHaveLength(2);
  });

  it('does not start without a bucket', async () => {
    vi.stubEnv('TALLYPOST_BUCKET', '');
    await expect(import('../../src/handlers/lambda/route.ts')).rejects.toThrow(
      'setting-missing at TALLYPOST_BUCKET: expected an environment variable, got nothing',
    );
  });
});
