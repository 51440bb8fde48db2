import { describe, expect, it } from 'vitest';
import { deliveriesOf } from '../../src/handlers/event-objects.ts';

const s3Record = (key: unknown, more: Record<string, unknown> = {}) => ({
  eventVersion: '2.1',
  eventSource: 'aws:s3',
  eventName: 'ObjectCreated:Put',
  responseElements: { 'x-amz-request-id': 'REQ1' },
  s3: { bucket: { name: 'b' }, object: { key } },
  ...more,
});
const sqs = (...bodies: unknown[]) => ({
  Records: bodies.map((body, i) => ({
    messageId: `m${i}`,
    eventSource: 'aws:sqs',
    body: typeof body === 'string' ? body : JSON.stringify(body),
  })),
});
const s3 = (...records: unknown[]) => ({ Records: records });

describe('deliveries of an event', () => {
  it('are the SQS messages, each with its objects', () => {
    expect(
      deliveriesOf(sqs(s3(s3Record('inbound/a')), s3(s3Record('inbound/b'), s3Record('inbound/c'))), ''),
    ).toEqual([
      { receipt: 'm0', objects: [{ key: 'inbound/a', trace: 'REQ1' }], fault: null },
      {
        receipt: 'm1',
        objects: [
          { key: 'inbound/b', trace: 'REQ1' },
          { key: 'inbound/c', trace: 'REQ1' },
        ],
        fault: null,
      },
    ]);
  });

  it('are one without a receipt for a direct S3 event', () => {
    expect(deliveriesOf(s3(s3Record('inbound/a')), '')).toEqual([
      { receipt: null, objects: [{ key: 'inbound/a', trace: 'REQ1' }], fault: null },
    ]);
  });

  it.each([
    ['inbound/two+words.eml', 'inbound/two words.eml'],
    ['inbound/a%2Bb%3Dc%25', 'inbound/a+b=c%'],
    ['inbound/%C3%BCmlaut-%E6%97%A5', 'inbound/ümlaut-日'],
  ])('hold keys form-decoded: %s', (encoded, key) => {
    expect(deliveriesOf(s3(s3Record(encoded)), '')[0]!.objects).toEqual([{ key, trace: 'REQ1' }]);
  });

  it('leave out what is not of this desk’s prefix, and take the prefix off', () => {
    const event = s3(
      s3Record('desks/water/inbound/a'),
      s3Record('desks/waterworks/inbound/b'),
      s3Record('inbound/c'),
    );
    expect(deliveriesOf(event, 'desks/water')[0]!.objects).toEqual([{ key: 'inbound/a', trace: 'REQ1' }]);
  });

  it('leave out what was not created', () => {
    expect(deliveriesOf(s3(s3Record('inbound/a', { eventName: 'ObjectRemoved:Delete' })), '')[0]).toEqual({
      receipt: null,
      objects: [],
      fault: null,
    });
  });

  it('hold nothing for S3’s test message, which is done with', () => {
    const test = { Service: 'Amazon S3', Event: 's3:TestEvent', Bucket: 'b' };
    expect(deliveriesOf(sqs(test), '')).toEqual([{ receipt: 'm0', objects: [], fault: null }]);
  });

  it('trace by the delivery when the request’s id is missing or odd', () => {
    const objects = (more: Record<string, unknown>) =>
      deliveriesOf(sqs(s3(s3Record('inbound/a', more))), '')[0]!.objects;
    expect(objects({ responseElements: undefined })[0]!.trace).toBe('m0');
    expect(objects({ responseElements: { 'x-amz-request-id': 'a b\n' } })[0]!.trace).toBe('');
  });

  it.each([
    [
      'a later major version',
      s3(s3Record('inbound/a', { eventVersion: '3.0' })),
      '/Records/0/eventVersion: 2.x, 3.0',
    ],
    [
      'no version',
      s3(s3Record('inbound/a', { eventVersion: undefined })),
      '/Records/0/eventVersion: 2.x, nothing',
    ],
    ['no key', s3(s3Record(undefined)), '/Records/0/s3/object/key: a form-encoded key, none'],
    ['an empty key', s3(s3Record('')), '/Records/0/s3/object/key: a form-encoded key, none'],
    [
      'broken percent-encoding',
      s3(s3Record('inbound/%zz')),
      '/Records/0/s3/object/key: a form-encoded key, none',
    ],
    ['no records', {}, ': Records of an S3 event, none'],
    ['records that are no objects', { Records: [3] }, ': Records of an S3 event, none'],
    ['a body that is not JSON', 'hello', ': Records of an S3 event, none'],
    ['null', 'null', ': Records of an S3 event, none'],
  ])('say what is not understood: %s', (_title, body, expected) => {
    const [good, bad] = deliveriesOf(sqs(s3(s3Record('inbound/a')), body), '');
    expect(good!.fault).toBeNull();
    expect(bad!.objects).toEqual([]);
    const { code, place, expected: wanted, got } = bad!.fault!;
    expect(code).toBe('event-not-understood');
    expect(`${place}: ${wanted}, ${got}`).toBe(`event#/Records/1/body${expected}`);
  });

  it('accept a later minor version', () => {
    expect(deliveriesOf(s3(s3Record('inbound/a', { eventVersion: '2.9' })), '')[0]!.fault).toBeNull();
  });
});
