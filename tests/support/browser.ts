import { mkdirSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { chromium, type BrowserContext, type Page } from 'playwright-core';

/** The two sizes every story is told at. */
export const sizes = { phone: { width: 390, height: 844 }, wide: { width: 1280, height: 800 } } as const;
export type Size = keyof typeof sizes;

const screens = join(__dirname, '..', '..', 'test-output', 'screens');

const pictures = join(__dirname, '..', '..', 'docs', 'screens');

/** Whether this run makes the pictures of the documents anew. */
export const keepsPictures = process.env.EVENFALL_KEEP_SCREENS === '1';

const flags = [
  '--no-sandbox',
  '--disable-gpu',
  '--disable-quic',
  '--no-first-run',
  '--disable-background-networking',
  '--disable-component-update',
  '--disable-sync',
];

export interface Browser {
  page: Page;
  context: BrowserContext;
  size: Size;
  /** Errors the page reported: console errors, uncaught exceptions and refused policies. */
  errors: string[];
  close(): Promise<void>;
}

/** Debian's Chromium with a fresh profile at one of the two sizes; `installs`: it may keep the built program, which costs each profile a fetch of it all. */
export async function openBrowser(baseURL: string, size: Size, installs = false): Promise<Browser> {
  const profile = mkdtempSync(join(tmpdir(), 'evenfall-browser-'));
  const context = await chromium.launchPersistentContext(profile, {
    executablePath: '/usr/bin/chromium-headless-shell',
    headless: true,
    args: flags,
    baseURL,
    viewport: sizes[size],
    acceptDownloads: true,
    serviceWorkers: installs ? 'allow' : 'block',
    timezoneId: 'Europe/Zurich',
    locale: 'en-GB',
    colorScheme: 'dark',
    reducedMotion: 'reduce',
    ...(size === 'phone' ? { isMobile: true, hasTouch: true } : {}),
  });
  await context.addInitScript({ content: 'globalThis.__name = (f) => f;' });
  const page = context.pages()[0] ?? (await context.newPage());
  page.setDefaultTimeout(15_000);
  const errors: string[] = [];
  page.on('pageerror', (error) => errors.push(String(error)));
  page.on('console', (message) => {
    if (message.type() === 'error' && !/net::ERR_|status of 4\d\d/.test(message.text())) errors.push(message.text());
  });
  return {
    page,
    context,
    size,
    errors,
    close: async () => {
      await context.close();
      rmSync(profile, { recursive: true, force: true });
    },
  };
}

/** Keeps a picture of the page as test output. */
export async function shoot(browser: Browser, name: string): Promise<void> {
  mkdirSync(screens, { recursive: true });
  await browser.page.screenshot({ path: join(screens, `${name}-${browser.size}.png`) });
}

/** Makes a picture of the documents anew, where that is asked for: a usual run leaves the tree as it is. */
export async function picture({ page }: Browser, name: string): Promise<void> {
  if (!keepsPictures) return;
  mkdirSync(pictures, { recursive: true });
  await page.screenshot({ path: join(pictures, `${name}.png`) });
}
