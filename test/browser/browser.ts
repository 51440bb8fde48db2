import { existsSync, readFileSync } from 'node:fs';
import { createRequire } from 'node:module';
import type { AxeResults } from 'axe-core';
import { type Browser, type BrowserContext, chromium, type Page } from 'playwright-core';
import { expect } from 'vitest';

/** Debian's Chromium; another one by TALLYPOST_CHROMIUM. */
export const chromiumPath = process.env.TALLYPOST_CHROMIUM ?? '/usr/bin/chromium';
export const hasChromium = existsSync(chromiumPath);
if (!hasChromium) console.warn(`left out: tests of the pages in a real browser (no ${chromiumPath})`);

const axeSource = readFileSync(createRequire(import.meta.url).resolve('axe-core/axe.min.js'), 'utf8');

export function openBrowser(): Promise<Browser> {
  return chromium.launch({
    executablePath: chromiumPath,
    headless: true,
    args: [
      '--no-sandbox',
      '--disable-gpu',
      '--disable-quic',
      '--no-first-run',
      '--disable-background-networking',
      '--disable-component-update',
      '--disable-sync',
    ],
  });
}

export interface Watched {
  readonly page: Page;
  /** Console errors, page errors and dialogs. */
  readonly troubles: string[];
  /** Requests that are not for the page's own place. */
  readonly outside: string[];
}

/** A page on which everything unwanted is on record. `own`: what a URL of its own begins with. */
export async function openWatched(context: BrowserContext, own: () => string): Promise<Watched> {
  const page = await context.newPage();
  // A machine with other work to do takes its time; a test that hangs has a limit of its own.
  page.setDefaultTimeout(120_000);
  const troubles: string[] = [];
  const outside: string[] = [];
  page.on('console', (message) => {
    if (message.type() === 'error' || message.type() === 'warning') troubles.push(message.text());
  });
  page.on('pageerror', (error) => troubles.push(String(error)));
  page.on('dialog', (dialog) => {
    troubles.push(`dialog: ${dialog.message()}`);
    void dialog.dismiss();
  });
  page.on('request', (request) => {
    if (!request.url().startsWith(own())) outside.push(request.url());
  });
  return { page, troubles, outside };
}

/** Rules of WCAG 2.0 to 2.2, levels A and AA, and axe-core's good practice: none may be broken. */
export async function expectAccessible(page: Page): Promise<void> {
  // Evaluated by the debugger, which the page's policy does not stop.
  await page.evaluate(axeSource);
  const results = await page.evaluate(() =>
    (globalThis as unknown as { axe: { run(options: unknown): Promise<AxeResults> } }).axe.run({
      runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'],
    }),
  );
  expect(
    results.violations.map(
      (each) => `${each.id}: ${each.nodes.map((node) => node.html.slice(0, 160)).join(' | ')}`,
    ),
  ).toEqual([]);
  expect(results.passes.length).toBeGreaterThan(10);
}

/** Nothing is wider than the screen. */
export async function expectNoSideways(page: Page): Promise<void> {
  const sizes = '[document.documentElement.scrollWidth, document.documentElement.clientWidth]';
  const [content, screen] = await page.evaluate<[number, number]>(sizes);
  expect(content).toBeLessThanOrEqual(screen);
}

export const screens = [
  { width: 360, height: 740, colorScheme: 'light' },
  { width: 360, height: 740, colorScheme: 'dark' },
  { width: 1440, height: 900, colorScheme: 'light' },
  { width: 1440, height: 900, colorScheme: 'dark' },
] as const;

/** Screenshots are kept where TALLYPOST_SCREENSHOTS says; without it none are made. */
export async function keepScreenshot(page: Page, name: string): Promise<void> {
  const folder = process.env.TALLYPOST_SCREENSHOTS;
  if (folder) await page.screenshot({ path: `${folder}/${name}.png`, fullPage: true });
}
