import { afterEach, describe, expect, it } from 'vitest';
import { readTicket, ticketKeyOf } from '../../src/settle/ticket.ts';
import { runCli } from './run-cli.ts';

const secret = 'a secret of more than thirty-two characters';
const url = 'https://abc123.lambda-url.eu-west-2.on.aws/';
const name = 'TALLYPOST_SETTLE_SECRET';

describe('tallypost link', () => {
  const before = process.env[name];
  afterEach(() => {
    if (before === undefined) delete process.env[name];
    else process.env[name] = before;
  });

  it('makes a link for one person and one page that ends after the hours given', async () => {
    process.env[name] = secret;
    const startedMs = Date.now();
    const ran = await runCli('link', 'Jo Quill', '--url', `${url}some/path?x=1`, '--hours', '2', '--json');
    const { link, by, until } = ran.json();
    expect([ran.code, by]).toEqual([0, 'Jo Quill']);
    const parsed = new URL(link);
    expect(`${parsed.origin}${parsed.pathname}`).toBe('https://abc123.lambda-url.eu-west-2.on.aws/enter');
    const read = (place: string, nowMs: number) =>
      readTicket(
        ticketKeyOf(Buffer.from(secret), place),
        'enter',
        parsed.searchParams.get('t') as string,
        nowMs,
      );
    const untilMs = Date.parse(until);
    expect(untilMs - startedMs).toBeGreaterThanOrEqual(7_200_000);
    expect(untilMs - startedMs).toBeLessThan(7_260_000);
    expect(read(parsed.origin, untilMs)).toMatchObject({ kind: 'valid', ticket: { by: 'Jo Quill' } });
    expect(read(parsed.origin, untilMs + 1)).toEqual({ kind: 'refused', why: 'expired' });
    expect(read('https://another.example', untilMs)).toEqual({ kind: 'refused', why: 'altered' });
  });

  it('makes another one each time, and says in words for whom and until when', async () => {
    process.env[name] = secret;
    const [one, two] = [await runCli('link', 'jo', '--url', url), await runCli('link', 'jo', '--url', url)];
    expect(one.out).toMatch(/^For jo alone, once, until \d{4}-\d\d-\d\d \d\d:\d\d UTC:\n\n {2}https:/);
    expect(one.out.split('\n')[2]).not.toBe(two.out.split('\n')[2]);
  });

  it.each([
    ['without a secret', '', ['jo', '--url', url], 'settle-secret-unusable'],
    ['with a short secret', 'short', ['jo', '--url', url], '5 characters'],
    ['without a page', secret, ['jo'], '--url'],
    ['for a page without TLS', secret, ['jo', '--url', 'http://abc.example/'], 'https'],
    ['for longer than over a weekend', secret, ['jo', '--url', url, '--hours', '73'], '72'],
    ['for no time', secret, ['jo', '--url', url, '--hours', '0'], 'more than 0'],
    ['for nobody', secret, [' ', '--url', url], 'characters'],
    ['for a name of two lines', secret, ['jo\nal', '--url', url], 'one line'],
  ])('makes none %s', async (_title, setting, args, says) => {
    process.env[name] = setting;
    const ran = await runCli('link', ...args);
    expect(ran.code).toBe(2);
    expect(ran.out).toBe('');
    expect(ran.err).toContain(says);
  });
});
