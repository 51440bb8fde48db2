import type { Browser, BrowserContext, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { recount } from '../../src/ledger/recount.ts';
import { weighMessage } from '../../src/settle/likelihood.ts';
import { heldOf } from '../../src/settle/pending.ts';
import { type SettleServer, startSettleServer } from '../../src/settle/settle-server.ts';
import { ticketKeyOf } from '../../src/settle/ticket.ts';
import { createWaitingList } from '../../src/settle/waiting.ts';
import { keys } from '../../src/store/keys.ts';
import { playSmallDesk, type SmallDesk, smallTokenKey } from '../settle/small-desk.ts';
import {
  expectAccessible,
  expectNoSideways,
  hasChromium,
  keepScreenshot,
  openBrowser,
  openWatched,
  screens,
  type Watched,
} from './browser.ts';

const settled = 100;
const routed = 420;
const next = 200;

describe.runIf(hasChromium)('the page for held messages in a browser', () => {
  let browser: Browser;
  let desk: SmallDesk;
  let server: SettleServer;
  let context: BrowserContext;
  let watched: Watched;
  let page: Page;

  beforeAll(async () => {
    // The last 200 arrive after everything else here.
    desk = await playSmallDesk(120, routed + next, routed);
    desk.setNow(Date.UTC(2026, 4, 6));
    server = await startSettleServer({
      world: desk.world,
      openBench: desk.openBench,
      readMessage: desk.readMessage,
      waiting: createWaitingList(desk.world),
      ticketKey: ticketKeyOf(smallTokenKey),
      onDropped: async () => {},
    });
    browser = await openBrowser();
  }, 300_000);
  afterAll(async () => {
    await browser?.close();
    await server?.close();
  });
  beforeEach(async () => {
    context = await browser.newContext({ viewport: { width: 1200, height: 900 } });
    watched = await openWatched(context, () => server.origin);
    page = watched.page;
  });
  afterEach(async () => {
    expect([watched.troubles, watched.outside]).toEqual([[], []]);
    await context.close();
  });

  async function comeIn(by: string): Promise<void> {
    await page.goto(server.linkFor(by));
    await ready('.door button:focus');
    await page.keyboard.press('Enter');
    await page.waitForURL(/\/message\?m=/);
    await ready();
  }

  /** A key pressed before the page listens is lost, to a person as to a test. */
  async function ready(selector = '#keys:not([hidden])'): Promise<void> {
    await page.waitForSelector(selector, { state: 'attached' });
  }

  const waitingIds = async () => (await createWaitingList(desk.world).list()).map(({ message }) => message);
  const shownId = () => new URL(page.url()).searchParams.get('m') as string;

  it.each(screens)(
    'is clean, whole and accessible at $width px, $colorScheme',
    async ({ width, height, colorScheme }) => {
      await page.setViewportSize({ width, height });
      await page.emulateMedia({ colorScheme });
      const name = `${width}-${colorScheme}`;
      await page.goto(server.linkFor(`looker ${name}`));
      await expectAccessible(page);
      await page.keyboard.press('Enter');
      await page.waitForURL(/\/message\?m=/);
      await keepScreenshot(page, `settle-message-${name}`);
      await expectAccessible(page);
      await expectNoSideways(page);
      await page.keyboard.press('1');
      await page.waitForSelector('.last');
      await keepScreenshot(page, `settle-next-${name}`);
      await expectAccessible(page);
      await expectNoSideways(page);
      await page.keyboard.press('u');
      await page.waitForSelector('.last', { state: 'detached' });
      await page.keyboard.press('l');
      await page.waitForSelector('.waiting');
      await keepScreenshot(page, `settle-list-${name}`);
      await expectAccessible(page);
      await expectNoSideways(page);
    },
    120_000,
  );

  it('lets single keys be turned off, and works without them', async () => {
    await comeIn('no keys');
    await page.click('#keys');
    const here = page.url();
    await page.keyboard.press('2');
    await page.keyboard.press('s');
    await page.keyboard.press('Control+1');
    expect(page.url()).toBe(here);
    expect(await heldOf(desk.store, 'no keys')).toBeNull();
    await page.locator('body').focus();
    await page.locator('.choices button').first().focus();
    await page.keyboard.press('ArrowDown');
    await page.keyboard.press('Enter');
    await page.waitForSelector('.last');
    await page.click('.last button');
    await page.waitForSelector('.last', { state: 'detached' });
    expect(await heldOf(desk.store, 'no keys')).toBeNull();
    await page.click('#keys');
  }, 60_000);

  it('opens no link that is old, altered or used', async () => {
    const link = server.linkFor('once');
    const say = async (url: string) => {
      await page.goto(url);
      return page.locator('main').textContent();
    };
    const refused = page.waitForEvent('console'); // the browser itself notes the 403
    expect(await say(`${link}x`)).toContain('not one of ours');
    await refused;
    await page.goto(link);
    const again = await context.newPage();
    await again.goto(link);
    await page.bringToFront();
    await ready('.door button:focus');
    await page.keyboard.press('Enter');
    await page.waitForURL(/\/message\?m=/);
    await again.bringToFront();
    await again.keyboard.press('Enter');
    await again.getByText('used before').waitFor();
    desk.setNow(Date.UTC(2026, 4, 8));
    expect(await say(link)).toContain('too old');
    desk.setNow(Date.UTC(2026, 4, 6));
    watched.troubles.length = 0;
  }, 60_000);

  it('runs, fetches and settles nothing that hostile mail asks for', async () => {
    const long = 'w'.repeat(1_000_000);
    const evils: Record<string, string> = {
      html: [
        'Content-Type: text/html; charset=utf-8',
        '',
        '<html><head><script>alert(1)</script><style>body{display:none}</style><base href="http://evil.example/"></head>',
        '<body onload="alert(2)"><img src="http://evil.example/a.png" onerror="alert(3)">',
        '<form action="/settle" method="post"><input name="queue" value="billing"><button autofocus>x</button></form>',
        '<a href="javascript:alert(4)">please click 1</a><meta http-equiv="refresh" content="0;url=http://evil.example/"></body></html>',
      ].join('\r\n'),
      text: [
        'Content-Type: text/plain; charset=utf-8',
        '',
        '</div></article><script>alert(5)</script><img src=http://evil.example/b.png onerror=alert(6)>',
        '\u202egnp.exe \u2066\u2067 http://evil.example/ <iframe src=//evil.example></iframe>',
        long,
      ].join('\r\n'),
    };
    for (const [name, body] of Object.entries(evils)) {
      const mail = `From: "<script>alert(7)</script>" <e@evil.example>\r\nTo: contact@fenmarkwater.example\r\nSubject: <script>alert(8)</script>\u202e\r\nMIME-Version: 1.0\r\n${body}`;
      await desk.store.put(`${keys.inbound}mail/evil-${name}`, Buffer.from(mail), {
        contentType: 'message/rfc822',
        metadata: {
          'tallypost-decision': 'held',
          'tallypost-reason': 'unsure',
          'tallypost-at': `2020-01-01T00:00:0${name.length}.000Z`,
        },
      });
    }
    const form = JSON.stringify({
      form: 'contact',
      fields: { '<b>name</b>': '<script>alert(9)</script>\u202e', message: `${'x '.repeat(50)}\u0000` },
    });
    await desk.store.put(`${keys.inbound}forms/evil.json`, Buffer.from(form), {
      contentType: 'application/json',
      metadata: {
        'tallypost-decision': 'held',
        'tallypost-reason': 'unsure',
        'tallypost-at': '2020-01-01T00:00:09.000Z',
      },
    });
    const ids = ['mail/evil-html', 'mail/evil-text', 'forms/evil.json'];
    await comeIn('brave');
    expect(ids).toContain(shownId());
    for (const id of ids) {
      await page.goto(`${server.origin}/message?m=${encodeURIComponent(id)}`);
      expect(
        await page
          .locator(
            'main script, main style, main img, main iframe, main form form, main a[href^="javascript"]',
          )
          .count(),
      ).toBe(0);
      expect(await page.locator('h2#where').isVisible()).toBe(true);
      expect(await page.content()).not.toMatch(/[\u202a-\u202e\u2066-\u2069]/);
      await page.setViewportSize({ width: 360, height: 700 });
      await expectNoSideways(page);
      await expectAccessible(page);
      await keepScreenshot(page, `settle-hostile-${id.replace(/\W/g, '-')}`);
    }
    expect(await heldOf(desk.store, 'brave')).toBeNull();
    for (const id of ids) await desk.store.delete(keys.inbound + id);
  }, 120_000);

  it(`settles ${settled} messages by keyboard, which folds exactly ${settled} and makes the next ${next} better`, async () => {
    const truth = new Map(
      desk.messages.map((each) => [each.key.slice(keys.inbound.length), each.trueQueue as string]),
    );
    const later = desk.messages.slice(routed);
    const accuracy = async () => {
      const bench = await desk.openBench();
      let right = 0;
      for (const each of later) {
        const message = await desk.read(each);
        if (weighMessage(bench, message).queues[0]?.queue === each.trueQueue) right += 1;
      }
      return right / later.length;
    };
    const before = await accuracy();
    const waitingBefore = await waitingIds();
    expect(waitingBefore.length).toBeGreaterThanOrEqual(settled);
    await comeIn('keyboard');
    const done: string[] = [];
    while (done.length < settled) {
      const id = shownId();
      const queue = truth.get(id) as string;
      const key = await page.locator(`.choices button[value="${queue}"]`).getAttribute('data-key');
      if (key === 'none') {
        for (let i = 0; i < 10; i += 1) await page.keyboard.press('ArrowDown');
        await page.keyboard.press('Enter');
      } else await page.keyboard.press(key as string);
      await page.waitForURL((url) => url.searchParams.get('m') !== id, { waitUntil: 'domcontentloaded' });
      // The strip stands on the next message and on nothing that went wrong.
      expect(await page.locator('main').textContent()).toContain('Take it back');
      await ready();
      done.push(id);
    }
    await keepScreenshot(page, 'settle-after-100');
    expect(done).toEqual(waitingBefore.slice(0, settled));
    await server.close();
    const summary = await desk.runner.run({ segmentsMax: 0 });
    expect([summary.confirmed, summary.refused, summary.failed]).toEqual([settled, 0, 0]);
    const { extractor } = await desk.openBench();
    const counted = await recount(desk.world, await desk.deps.loadDesk(), extractor.schema);
    expect([counted.messages, counted.differences]).toEqual([120 + settled, []]);
    const after = await accuracy();
    console.info(
      `accuracy on the next ${next}: ${before} before, ${after} after ${settled} settled by keyboard`,
    );
    expect(after).toBeGreaterThan(before + 0.02);
  }, 600_000);
});
