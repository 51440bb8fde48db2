import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import type { Browser } from 'playwright-core';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { reportPage } from '../../src/report/report-page.ts';
import { sampleReport } from '../report/sample-data.ts';
import {
  expectAccessible,
  expectNoSideways,
  hasChromium,
  keepScreenshot,
  openBrowser,
  openWatched,
  screens,
} from './browser.ts';

describe.runIf(hasChromium)('the report in a browser', () => {
  let browser: Browser;
  const folder = mkdtempSync(join(tmpdir(), 'tallypost-report-'));
  const file = join(folder, 'report.html');
  const url = pathToFileURL(file).href;

  beforeAll(async () => {
    writeFileSync(file, reportPage(sampleReport));
    browser = await openBrowser();
  }, 120_000);
  afterAll(async () => {
    await browser?.close();
    rmSync(folder, { recursive: true });
  });

  it.each(screens)(
    'is clean, whole and accessible at $width px, $colorScheme',
    async ({ width, height, colorScheme }) => {
      const context = await browser.newContext({ viewport: { width, height }, colorScheme });
      const { page, troubles, outside } = await openWatched(context, () => url);
      await page.goto(url);
      await keepScreenshot(page, `report-${width}-${colorScheme}`);
      await expectAccessible(page);
      await expectNoSideways(page);
      expect([troubles, outside]).toEqual([[], []]);
      // The style was applied, so the policy's hash is that of the style.
      expect(await page.evaluate('getComputedStyle(document.body).fontFamily')).toContain('Noto Sans');
      await context.close();
    },
  );

  it('runs no script even when one gets in', async () => {
    const evil = reportPage(sampleReport).replace(
      '</main>',
      '<script>document.title = "owned"</script><img src="http://evil.example/x.png"></main>',
    );
    writeFileSync(file, evil);
    const context = await browser.newContext();
    const { page, troubles } = await openWatched(context, () => url);
    await page.goto(url);
    expect(await page.title()).toContain('Fenmark Water');
    expect(troubles.some((trouble) => trouble.includes('Content Security Policy'))).toBe(true);
    await context.close();
    writeFileSync(file, reportPage(sampleReport));
  });

  it('is read by keyboard: every task leads to its view, every table of numbers opens', async () => {
    const context = await browser.newContext({ viewport: { width: 1000, height: 800 } });
    const { page } = await openWatched(context, () => url);
    await page.goto(url);
    await page.keyboard.press('Tab');
    await page.keyboard.press('Enter');
    expect(new URL(page.url()).hash).toBe('#volume');
    await page.locator('summary').first().focus();
    await page.keyboard.press('Enter');
    expect(await page.locator('details[open] table').count()).toBe(1);
    await context.close();
  });
});
