import { readFileSync } from 'node:fs';
import { afterEach, describe, expect, it, vi } from 'vitest';
import { createBackfillHandler } from '../../src/handlers/backfill.ts';
import { createIntakeHandler } from '../../src/handlers/intake.ts';
import { createIntakeDeskLoader } from '../../src/handlers/intake-desk.ts';
import { createDeskLoader } from '../../src/handlers/load-desk.ts';
import { metadataOf } from '../../src/handlers/routing-metadata.ts';
import { openStation } from '../handlers/station.ts';

const read = (name: string) =>
  JSON.parse(readFileSync(new URL(`../../events/${name}`, import.meta.url), 'utf8'));
/** Base64 of the 24 bytes `fenmark-webhook-secret-1`, with which intake-confirmation.json is signed. */
const secret = 'whsec_ZmVubWFyay13ZWJob29rLXNlY3JldC0x';
/** Of that file: webhook-timestamp 1767631471. */
const signedAtMs = 1767631471_000;

afterEach(() => {
  vi.useRealTimers();
});

async function openDesk() {
  const station = await openStation(undefined, read('desk.json'));
  const loadDesk = createDeskLoader(station.world);
  const handle = createIntakeHandler({
    world: station.world,
    loadDesk: createIntakeDeskLoader(loadDesk, ` ${secret}\n`),
    log: station.deps.log,
  });
  return { station, handle, backfill: createBackfillHandler(station.deps) };
}

describe('the example events, with the example desk', () => {
  it('store a form of either media type', async () => {
    const { station, handle } = await openDesk();
    const json = await handle(read('intake-form.json'));
    expect([json.statusCode, json.headers['access-control-allow-origin']]).toEqual([
      202,
      'https://www.fenmarkwater.example',
    ]);
    const encoded = await handle(read('intake-form-encoded.json'));
    expect([encoded.statusCode, encoded.headers.location]).toEqual([
      303,
      'https://www.fenmarkwater.example/leak-reported',
    ]);
    const forms = await station.keys('inbound/forms/');
    expect(await Promise.all(forms.map(station.json))).toMatchObject([
      { form: 'contact', from: 'w.quillfether@postbox.example', fields: { topic: 'bill' } },
      { form: 'leak', fields: { where: 'road', place: '12 Sluice Lane, Harrowfen' } },
    ]);
    expect(await station.feed(station.route, ...forms)).toEqual({ batchItemFailures: [] });
    expect((await station.metadata(forms[0]!))['tallypost-trace']).toBe(
      '00000000-0000-4000-8000-000000000201',
    );
  });

  it('drop a confirmation that the desk’s pointers and names map, and refuse it once it is old', async () => {
    vi.useFakeTimers({ now: signedAtMs + 4 * 60_000, toFake: ['Date'] });
    const { station, handle } = await openDesk();
    expect((await handle(read('intake-confirmation.json'))).statusCode).toBe(202);
    const [drop] = await station.keys('confirmations/');
    expect(await station.json(drop!)).toEqual({
      message: 'mail/20260105T082528-9d4908b8',
      queue: 'billing',
      by: 'j.osgodby',
      at: '2026-01-05T16:44:30.000Z',
    });
    vi.setSystemTime(signedAtMs + 6 * 60_000);
    expect((await handle(read('intake-confirmation.json'))).statusCode).toBe(401);
  });

  it('learn an archived message', async () => {
    const { station, backfill } = await openDesk();
    const mail = readFileSync(new URL('../../events/messages/plain.eml', import.meta.url));
    await station.store.put('inbound/archive/billing/2025/final bill.eml', mail);
    const { results } = await backfill(read('backfill.json'));
    expect(results).toEqual([
      { taskId: 'dGFza2lkZ29lc2hlcmUK', resultCode: 'Succeeded', resultString: 'billing' },
    ]);
    expect(await station.keys('confirmations/')).toHaveLength(1);
  });
});

/** As EventBridge matches: every member of the pattern, any of its values; `{"prefix": …}` besides equal text.
 *  Source: Amazon EventBridge User Guide, "Event patterns". */
function matches(pattern: unknown, event: unknown): boolean {
  if (Array.isArray(pattern))
    return pattern.some((one) =>
      typeof one === 'object' && one !== null && 'prefix' in one
        ? typeof event === 'string' && event.startsWith(one.prefix as string)
        : one === event,
    );
  return Object.entries(pattern as Record<string, unknown>).every(
    ([name, inner]) =>
      typeof event === 'object' && event !== null && matches(inner, (event as Record<string, unknown>)[name]),
  );
}

describe('the example rule for the rest of the company', () => {
  const { Resources } = read('eventbridge-rule.json');
  const pattern = structuredClone(Resources.Rule.Properties.EventPattern);
  pattern.detail.bucket.name = ['fenmark-mail'];
  /** As S3 sends it. Source: Amazon S3 User Guide, "EventBridge event message structure". */
  const event = (key: string, reason: string, bucket = 'fenmark-mail') => ({
    version: '0',
    id: '00000000-0000-4000-8000-000000000401',
    'detail-type': 'Object Created',
    source: 'aws.s3',
    account: '000000000000',
    time: '2026-01-05T08:25:30Z',
    region: 'eu-west-2',
    resources: [`arn:aws:s3:::${bucket}`],
    detail: {
      version: '0',
      bucket: { name: bucket },
      object: { key, size: 1711, etag: 'b1946ac92492d2347c6235b4d2611184', sequencer: '01' },
      'request-id': 'EXAMPLE1',
      requester: '000000000000',
      reason,
    },
  });

  it.each([
    ['a decision written on a message', event('inbound/mail/a b', 'CopyObject'), true],
    ['a message that has just come', event('inbound/mail/a b', 'PutObject'), false],
    ['a history', event('histories/mail/a b.json', 'PutObject'), false],
    ['a copy elsewhere in the bucket', event('reports/x', 'CopyObject'), false],
    ['another bucket', event('inbound/mail/a b', 'CopyObject', 'other'), false],
  ])('sees %s: %j → %s', (_title, given, isSeen) => {
    expect(matches(pattern, given)).toBe(isSeen);
  });

  it('reads the metadata that the router writes, and lets held messages lie', () => {
    const { States } = Resources.Forward.Properties.Definition;
    const posterior = {
      queues: ['billing', 'leaks'],
      logProb: new Float64Array(2),
      probability: Float64Array.of(0.9, 0.1),
      tokens: 9,
      knownTokens: 9,
    };
    const written = metadataOf(
      { kind: 'routed', queue: 'billing', posterior: 0.9, expectedMinutes: 1, isAudit: false },
      posterior,
      { modelVersion: 1, schema: 's', atMs: 0, trace: 't' },
    );
    const named = [...JSON.stringify(States).matchAll(/\['(tallypost-[a-z-]+)'\]/g)].map(([, name]) => name!);
    expect(new Set(named)).toEqual(new Set(['tallypost-queue', 'tallypost-decision', 'tallypost-posterior']));
    for (const name of named) expect(written).toHaveProperty(name);
    const [toTeam] = States.IsForTeam.Choices;
    expect(toTeam.And.at(-1)).toEqual({
      Not: { Variable: "$.found.metadata['tallypost-decision']", StringEquals: 'held' },
    });
    expect([toTeam.Next, States.IsForTeam.Default]).toEqual(['TellTeam', 'NotForTeam']);
  });
});
