import { Readable } from 'node:stream';
import {
  GetObjectCommand,
  HeadObjectCommand,
  PutObjectCommand,
  S3Client,
  S3ServiceException,
} from '@aws-sdk/client-s3';
import { mockClient } from 'aws-sdk-client-mock';
import { beforeEach, describe, expect, it } from 'vitest';
import { createS3Store } from '../../src/store/s3.ts';
import { confirmation, formEvent, job, mail, open, secret, signedEvent } from './requests.ts';

describe('requests to S3', () => {
  const client = mockClient(S3Client);
  const store = createS3Store({
    client: new S3Client({ region: 'eu-west-2' }),
    bucket: 'fenmark-mail',
    prefix: 'desk',
  });
  const requests = () =>
    client.calls().map((call) => {
      const { Body, ...input } = call.args[0].input as unknown as { readonly Body?: Uint8Array };
      return Body === undefined || Body.length === 0
        ? input
        : { ...input, Body: JSON.parse(Buffer.from(Body).toString()) };
    });
  const failure = (httpStatusCode: number, name: string) =>
    new S3ServiceException({
      name,
      $fault: 'client',
      message: 'as S3 says it',
      $metadata: { httpStatusCode },
    });
  const bodyOf = (text: string) => Readable.from([Buffer.from(text)]) as never;
  const signed = () => signedEvent(secret, Date.now(), confirmation, 'r2');
  // sha256 of "msg_1", by `printf msg_1 | sha256sum`.
  const id = '116b88f173007be5e05df2a87105f0950bef284d0ceca39951e9bae80706ac45';
  beforeEach(() => {
    client.reset();
  });

  it('of a form: one write, its trace on it', async () => {
    client.on(PutObjectCommand).resolves({ ETag: '"e"' });
    const { intake } = open(store);
    const answer = await intake(formEvent('/forms/contact', { topic: 'bill', message: 'hello' }, 'r1'));
    expect(answer.statusCode).toBe(202);
    expect(requests()).toEqual([
      {
        Bucket: 'fenmark-mail',
        // A quarter of 2^32 is 1073741824, in base 36 hra0hs.
        Key: 'desk/inbound/forms/contact/2026-03-02/2026-03-02T09-00-00-000Z-0hra0hs0hra0hs.json',
        ContentType: 'application/json',
        Metadata: { 'tallypost-trace': 'r1' },
        Body: {
          form: 'contact',
          at: '2026-03-02T09:00:00.000Z',
          fields: { topic: 'bill', message: 'hello' },
        },
      },
    ]);
  });

  it('of a confirmation: a look for its mark, the drop, the mark', async () => {
    client.on(HeadObjectCommand).rejects(failure(404, 'NotFound'));
    client.on(PutObjectCommand).resolves({ ETag: '"e"' });
    expect((await open(store).intake(signed())).statusCode).toBe(202);
    expect(requests()).toEqual([
      { Bucket: 'fenmark-mail', Key: `desk/webhook-marks/${id}` },
      {
        Bucket: 'fenmark-mail',
        Key: `desk/confirmations/webhook-${id}.json`,
        IfNoneMatch: '*',
        ContentType: 'application/json',
        Body: { message: 'mail/1', queue: 'billing', by: 'jo', at: '2026-03-02T08:59:30.000Z' },
      },
      {
        Bucket: 'fenmark-mail',
        Key: `desk/webhook-marks/${id}`,
        IfNoneMatch: '*',
        ContentType: 'application/octet-stream',
      },
    ]);
  });

  it('of a confirmation that was taken: the look alone', async () => {
    client.on(HeadObjectCommand).resolves({ ETag: '"e"' });
    expect((await open(store).intake(signed())).statusCode).toBe(200);
    expect(client.calls()).toHaveLength(1);
  });

  it.each([
    ['412, which is its own write or another delivery’s', 412, 'PreconditionFailed'],
    ['409, another delivery at the same time', 409, 'ConditionalRequestConflict'],
  ])('of a confirmation whose writes are answered %s', async (_title, status, name) => {
    client.on(HeadObjectCommand).rejects(failure(404, 'NotFound'));
    client.on(PutObjectCommand).rejects(failure(status, name));
    expect((await open(store).intake(signed())).statusCode).toBe(202);
  });

  it.each([
    [403, 'AccessDenied', 'store-refused'],
    [404, 'NoSuchBucket', 'store-missing'],
    [503, 'SlowDown', 'store-unavailable'],
    [400, 'InvalidRequest', 'store-failed'],
  ])(
    'that are answered %i %s: the sender is asked to come again, the log says %s',
    async (status, name, fault) => {
      client.onAnyCommand().rejects(failure(status, name));
      const { intake, backfill, log } = open(store, 'desk');
      for (const event of [
        formEvent('/forms/contact', { topic: 'bill', message: 'hello' }, 'r1'),
        signed(),
      ]) {
        const answer = await intake(event);
        expect([answer.statusCode, JSON.parse(answer.body).type, answer.headers['retry-after']]).toEqual([
          503,
          'urn:tallypost:problem:unavailable',
          '5',
        ]);
      }
      const { results } = await backfill(job('desk/inbound/archive/billing/a.eml'));
      expect(results).toEqual([
        { taskId: 't1', resultCode: 'TemporaryFailure', resultString: 'the store failed; see the log' },
      ]);
      expect(log.map(({ level, fault, code }) => [level, fault ?? code])).toEqual(
        [fault, fault, fault].map((each) => ['error', each]),
      );
    },
  );

  it('of a backfilled message: one read, one drop that a second job would name the same', async () => {
    client.on(GetObjectCommand).resolves({
      ETag: '"m"',
      ContentLength: mail.length,
      LastModified: new Date('2026-03-01T00:00:00Z'),
      ContentType: 'message/rfc822',
      Body: bodyOf(mail),
    });
    client.on(PutObjectCommand).resolves({ ETag: '"e"' });
    const { results } = await open(store, 'desk').backfill(job('desk/inbound/archive/billing/a+b.eml'));
    expect(results[0]!.resultCode).toBe('Succeeded');
    expect(requests()).toEqual([
      { Bucket: 'fenmark-mail', Key: 'desk/inbound/archive/billing/a b.eml' },
      {
        Bucket: 'fenmark-mail',
        // `printf 'inbound/archive/billing/a b.eml\nbilling' | sha256sum`
        Key: 'desk/confirmations/backfill-65c2b304afc3f14d64b9319ffb7c9376e125100539bb3a156298540e80e13266.json',
        IfNoneMatch: '*',
        ContentType: 'application/json',
        Body: {
          message: 'archive/billing/a b.eml',
          queue: 'billing',
          by: 'backfill',
          at: '2025-03-03T09:00:00.000Z',
        },
      },
    ]);
  });

  it('of a backfilled message whose drop is there already: done', async () => {
    client.on(GetObjectCommand).resolves({ ETag: '"m"', ContentLength: mail.length, Body: bodyOf(mail) });
    client.on(PutObjectCommand).rejects(failure(412, 'PreconditionFailed'));
    const { results } = await open(store, 'desk').backfill(job('desk/inbound/archive/billing/a.eml'));
    expect(results[0]!.resultCode).toBe('Succeeded');
  });
});
