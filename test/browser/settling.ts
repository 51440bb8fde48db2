import type { Page } from 'playwright-core';
import { expect } from 'vitest';
import { expectAccessible, expectNoSideways, keepScreenshot } from './browser.ts';
import { hostileIds } from './hostile-mail.ts';

/** A key pressed before the page listens is lost, to a person as to a test; and nobody presses one before there is a picture. */
export async function ready(page: Page, selector = '#keys:not([hidden])'): Promise<void> {
  await page.waitForSelector(selector, { state: 'attached' });
  await page.evaluate('new Promise((go) => requestAnimationFrame(() => requestAnimationFrame(go)))');
}

/** Follows a link to the door and goes in by keyboard; ends on the first message. */
export async function comeIn(page: Page, link: string): Promise<void> {
  await page.goto(link);
  await ready(page, '.door button:focus');
  await page.keyboard.press('Enter');
  await page.waitForURL(/\/message\?m=/);
  await ready(page);
}

export const shownId = (page: Page): string => new URL(page.url()).searchParams.get('m') as string;

/** Chooses a queue for the message shown by keys alone; ends on what comes next, whatever that is. */
export async function settleByKey(page: Page, queue: string): Promise<void> {
  const id = shownId(page);
  const button = page.locator(`.choices button[value="${queue}"]`);
  const key = await button.getAttribute('data-key');
  if (key === 'none') {
    // Beyond the ninth: down to it.
    for (let i = 0; i < 40 && !(await button.evaluate((node) => node.matches(':focus'))); i += 1)
      await page.keyboard.press('ArrowDown');
    await page.keyboard.press('Enter');
  } else await page.keyboard.press(key as string);
  await page.waitForURL((url) => url.searchParams.get('m') !== id, { waitUntil: 'domcontentloaded' });
  await ready(page);
}

/** Each hostile message is shown, and none of what it tries happens; what the page said and fetched is looked at by the caller. */
export async function expectHostileMailTame(page: Page, origin: string): Promise<void> {
  for (const id of hostileIds) {
    await page.goto(`${origin}/message?m=${encodeURIComponent(id)}`);
    const markup =
      'main script, main style, main img, main iframe, main form form, main a[href^="javascript"], main a[href^="/enter"]';
    expect(await page.locator(markup).count()).toBe(0);
    expect(await page.locator('h2#where').isVisible()).toBe(true);
    expect(await page.content()).not.toMatch(/[\u202a-\u202e\u2066-\u2069]/);
    await page.setViewportSize({ width: 360, height: 700 });
    await expectNoSideways(page);
    await expectAccessible(page);
    await keepScreenshot(page, `settle-hostile-${id.replace(/\W/g, '-')}`);
  }
}
