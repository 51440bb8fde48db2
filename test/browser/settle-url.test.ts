import { execFileSync } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import type { Browser, BrowserContext, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { linkTo } from '../../src/settle/link.ts';
import { heldOf } from '../../src/settle/pending.ts';
import { createWaitingList } from '../../src/settle/waiting.ts';
import { markWaiting } from '../../src/settle/waiting-marks.ts';
import { keys } from '../../src/store/keys.ts';
import { type FunctionUrl, makeCertificate, startFunctionUrl } from '../lambda/function-url.ts';
import { type LoopbackS3, startLoopbackS3 } from '../lambda/loopback-s3.ts';
import { type StartedFunction, startFunction } from '../lambda/runtime.ts';
import { playSmallDesk, type SmallDesk, smallTokenKey } from '../settle/small-desk.ts';
import { hasChromium, openBrowser, openWatched, type Watched } from './browser.ts';
import { hostileIds, putHostileMail, takeHostileMail } from './hostile-mail.ts';
import { comeIn, expectHostileMailTame, ready, settleByKey, shownId } from './settling.ts';

const project = fileURLToPath(new URL('../../', import.meta.url));
const secret = 'a secret of more than thirty-two characters';
const certificate = hasChromium ? makeCertificate() : null;
if (hasChromium && certificate === null)
  console.warn('left out: the deployed page in a real browser (no openssl to make a certificate with)');

/** The built bundle, by the runtime's protocol, behind a URL over TLS, over S3's protocol. */
describe.runIf(certificate !== null)('the deployed page for held messages in a browser', () => {
  const root = mkdtempSync(join(tmpdir(), 'tallypost-settle-url-'));
  const bucket = 'fenmark-mail';
  let browser: Browser;
  let desk: SmallDesk;
  let s3: LoopbackS3;
  let one: StartedFunction;
  let page: Page;
  let url: FunctionUrl;
  let context: BrowserContext;
  let watched: Watched;
  let elsewhere: Server;
  let attack = '';

  beforeAll(async () => {
    const bundle = ['--functions', '--only=settle', `--into=${root}`];
    execFileSync(process.execPath, [join(project, '.config/bundle.mjs'), ...bundle], { stdio: 'ignore' });
    desk = await playSmallDesk(60, 100);
    for (const { message } of await createWaitingList(desk.world).list())
      await markWaiting(desk.world, message);
    s3 = await startLoopbackS3(desk.store, bucket);
    one = await startFunction(join(root, 'functions/settle/index.mjs'), {
      AWS_ENDPOINT_URL_S3: s3.endpoint,
      TALLYPOST_BUCKET: bucket,
      TALLYPOST_TOKEN_KEY: Buffer.from(smallTokenKey).toString('hex'),
      TALLYPOST_SETTLE_SECRET: secret,
    });
    url = await startFunctionUrl(one, certificate!);
    elsewhere = createServer((_, response) =>
      response.writeHead(200, { 'content-type': 'text/html' }).end(attack),
    );
    await new Promise<void>((resolve) => elsewhere.listen(0, '127.0.0.1', resolve));
    browser = await openBrowser();
  }, 300_000);
  afterAll(async () => {
    await browser?.close();
    await url?.close();
    await one?.stop();
    await s3?.close();
    elsewhere?.close();
    rmSync(root, { recursive: true, force: true });
  });
  beforeEach(async () => {
    context = await browser.newContext({
      viewport: { width: 1200, height: 900 },
      ignoreHTTPSErrors: true,
    });
    watched = await openWatched(context, () => url.origin);
    page = watched.page;
  });
  afterEach(async () => {
    expect([watched.troubles, watched.outside]).toEqual([[], []]);
    await context.close();
  });

  let count = 0;
  const linkFor = (by: string, untilMs = Date.now() + 3_600_000) => {
    count += 1;
    return linkTo(Buffer.from(secret), { url: new URL(url.origin), by, untilMs, number: `n${count}` });
  };
  const keysOf = async (prefix: string) => {
    const found: string[] = [];
    for await (const { key } of desk.store.list(prefix)) found.push(key);
    return found;
  };

  it('lets a person in, who settles by keyboard; what they said is dropped as a helpdesk would', async () => {
    await comeIn(page, linkFor('jo'));
    // The link is no more to be seen, and the cookie that took its place is out of every script's reach.
    expect(page.url()).not.toContain('enter');
    expect(await page.evaluate('document.cookie')).toBe('');
    expect(await context.cookies()).toMatchObject([
      { name: '__Host-tallypost-settle', httpOnly: true, secure: true, sameSite: 'Strict', path: '/' },
    ]);
    const first = shownId(page);
    await settleByKey(page, 'billing');
    expect(await page.locator('.last').textContent()).toContain('with this one counted');
    expect(await keysOf(keys.confirmations)).toEqual([]);
    const second = shownId(page);
    expect(second).not.toBe(first);
    await page.keyboard.press('u');
    await page.waitForSelector('.last', { state: 'detached' });
    expect([shownId(page), await heldOf(desk.store, 'jo')]).toEqual([first, null]);
    await ready(page);
    await settleByKey(page, 'billing');
    await settleByKey(page, 'complaints');
    const [drop, ...more] = await keysOf(keys.confirmations);
    expect(more).toEqual([]);
    const got = await desk.store.get(drop as string);
    expect(got.kind === 'found' && JSON.parse(Buffer.from(got.object.body).toString())).toMatchObject({
      message: first,
      queue: 'billing',
      by: 'jo',
    });
    expect(await heldOf(desk.store, 'jo')).toMatchObject({ message: second, queue: 'complaints' });
  }, 300_000);

  it('opens no link that is old, altered or used', async () => {
    const say = async (link: string) => {
      await page.goto(link);
      return page.locator('main').textContent();
    };
    expect(await say(`${linkFor('jo')}x`)).toContain('not one of ours');
    expect(await say(linkFor('jo', Date.now() - 1000))).toContain('too old');
    const link = linkFor('al');
    await comeIn(page, link);
    await page.goto(link);
    await ready(page, '.door button:focus');
    await page.keyboard.press('Enter');
    await page.getByText('used before').waitFor();
    // The browser itself notes each 403.
    expect(watched.troubles.every((line) => line.includes('403'))).toBe(true);
    watched.troubles.length = 0;
  }, 300_000);

  it('settles nothing that another site posts in a person’s name, with their cookie or without', async () => {
    await comeIn(page, linkFor('sam'));
    const id = shownId(page);
    const token = await page.locator('input[name="token"]').first().inputValue();
    const fields = Object.entries({ message: id, queue: 'billing', token })
      .map(([name, value]) => `<input type="hidden" name="${name}" value="${value}">`)
      .join('');
    attack = `<!doctype html><title>x</title><form method="post" action="${url.origin}/settle">${fields}</form><script>document.forms[0].submit()</script>`;
    const other = await context.newPage();
    // Another port of the same host is the same site to cookies, over TLS even more so; another host is another site.
    const { port } = elsewhere.address() as AddressInfo;
    for (const host of ['127.0.0.1', 'localhost']) {
      await other.goto(`http://${host}:${port}/`);
      await other.waitForURL(`${url.origin}/settle`);
      expect(await other.locator('main').textContent()).toContain('Not from this page');
    }
    expect(await heldOf(desk.store, 'sam')).toBeNull();
    expect(shownId(page)).toBe(id);
  }, 300_000);

  it('runs, fetches and settles nothing that hostile mail asks for', async () => {
    await putHostileMail(desk.store);
    for (const id of hostileIds) await markWaiting(desk.world, id);
    await comeIn(page, linkFor('brave'));
    await expectHostileMailTame(page, url.origin);
    expect(await heldOf(desk.store, 'brave')).toBeNull();
    await takeHostileMail(desk.store);
  }, 300_000);

  it('logged nothing but lines of JSON that name no message and nobody', async () => {
    const lines = one.output().split('\n').filter(Boolean);
    expect(lines.length).toBeGreaterThan(20);
    for (const line of lines)
      expect(Object.keys(JSON.parse(line)).sort()).toEqual(['event', 'level', 'status', 'time', 'trace']);
  });
});
