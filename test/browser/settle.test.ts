import type { Browser, BrowserContext, Page } from 'playwright-core';
import { afterAll, afterEach, beforeAll, beforeEach, describe, expect, it } from 'vitest';
import { recount } from '../../src/ledger/recount.ts';
import { posteriorOf } from '../../src/model/posterior-of.ts';
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
import { hostileIds, putHostileMail, takeHostileMail } from './hostile-mail.ts';
import { comeIn, expectHostileMailTame, ready, settleByKey, shownId } from './settling.ts';

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

  const enter = (by: string) => comeIn(page, server.linkFor(by));
  const waitingIds = async () => (await createWaitingList(desk.world).list()).map(({ message }) => message);

  it.each(screens)(
    'is clean, whole and accessible at $width px, $colorScheme',
    async ({ width, height, colorScheme }) => {
      await page.setViewportSize({ width, height });
      await page.emulateMedia({ colorScheme });
      const name = `${width}-${colorScheme}`;
      await page.goto(server.linkFor(`looker ${name}`));
      await ready(page, '.door button:focus');
      await expectAccessible(page);
      await page.keyboard.press('Enter');
      await page.waitForURL(/\/message\?m=/);
      await ready(page);
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
    300_000,
  );

  it('lets single keys be turned off, and works without them', async () => {
    await enter('no keys');
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
  }, 300_000);

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
    await ready(page, '.door button:focus');
    await page.keyboard.press('Enter');
    await page.waitForURL(/\/message\?m=/);
    await again.bringToFront();
    await ready(again, '.door button:focus');
    await again.keyboard.press('Enter');
    await again.getByText('used before').waitFor();
    desk.setNow(Date.UTC(2026, 4, 8));
    expect(await say(link)).toContain('too old');
    desk.setNow(Date.UTC(2026, 4, 6));
    watched.troubles.length = 0;
  }, 300_000);

  it('runs, fetches and settles nothing that hostile mail asks for', async () => {
    await putHostileMail(desk.store);
    await enter('brave');
    expect(hostileIds).toContain(shownId(page));
    await expectHostileMailTame(page, server.origin);
    expect(await heldOf(desk.store, 'brave')).toBeNull();
    await takeHostileMail(desk.store);
  }, 300_000);

  it(`settles ${settled} messages by keyboard, which folds exactly ${settled} and makes the next ${next} better`, async () => {
    const truth = new Map(
      desk.messages.map((each) => [each.key.slice(keys.inbound.length), each.trueQueue as string]),
    );
    const later = desk.messages.slice(routed);
    const accuracy = async () => {
      const { model, extractor } = await desk.openBench();
      let right = 0;
      for (const each of later) {
        const { queues, probability } = posteriorOf(model.scorer, extractor.extract(await desk.read(each)));
        const likeliest = probability.indexOf(Math.max(...probability));
        if (queues[likeliest] === each.trueQueue) right += 1;
      }
      return right / later.length;
    };
    const before = await accuracy();
    const waitingBefore = await waitingIds();
    expect(waitingBefore.length).toBeGreaterThanOrEqual(settled);
    await enter('keyboard');
    const done: string[] = [];
    while (done.length < settled) {
      const id = shownId(page);
      await settleByKey(page, truth.get(id) as string);
      // The strip stands on the next message and on nothing that went wrong.
      expect(await page.locator('main').textContent()).toContain('Take it back');
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
