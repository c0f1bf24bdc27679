import { mkdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { chromium, type BrowserContext, type CDPSession, type Page } from 'playwright-core';

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
/** Pages live for seconds: neither compiling their program with much care nor collecting their garbage often gives back what it costs. */
const quickProgram = '--js-flags=--no-maglev,--no-opt,--always-sparkplug,--min-semi-space-size=32';
/** A camera that shows a film, and a browser that lets every page use it. A page that reads pictures is worth compiling. */
const cameraFlags = (film: string) => [
  '--use-fake-device-for-media-stream',
  '--use-fake-ui-for-media-stream',
  `--use-file-for-fake-video-capture=${film}`,
];

export interface Browser {
  page: Page;
  context: BrowserContext;
  size: Size;
  /** Errors the page reported: console errors, uncaught exceptions and refused policies. */
  errors: string[];
  close(): Promise<void>;
}

/** A browser that is between two users, with what it knows of the program at this address. */
interface Idle {
  key: string;
  context: BrowserContext;
}
const idle: Idle[] = [];
/** How long a browser waits for its next user before it ends, ms. */
const idleMs = 20_000;

export interface BrowserOptions {
  /** It may keep the built program, is really new and really ends. */
  installs?: boolean;
  /** The film (YUV4MPEG2) that its camera shows over and over; such a browser is really new and really ends. */
  film?: string;
}

async function launch(baseURL: string, size: Size, { installs = false, film }: BrowserOptions): Promise<BrowserContext> {
  const context = await chromium.launchPersistentContext('', {
    executablePath: '/usr/bin/chromium-headless-shell',
    headless: true,
    args: [...flags, ...(film === undefined ? [quickProgram] : cameraFlags(film))],
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
  return context;
}

/** A page of a browser that nobody uses, without anything its last user left but the program of this address; or of a new one. */
async function blankPage(baseURL: string, key: string, fresh: () => Promise<BrowserContext>) {
  const kept = idle.findIndex((one) => one.key === key);
  const known = kept < 0 ? null : (idle.splice(kept, 1)[0]?.context ?? null);
  // One that has died since it was used last is no finding of the test that asks for it next.
  const again = known === null ? null : await known.newPage().catch(() => null);
  if (known === null || again === null) {
    const context = await fresh();
    return { context, page: await context.newPage() };
  }
  const [context, page] = [known, again];
  await context.clearCookies();
  const session = await context.newCDPSession(page);
  await session.send('Storage.clearDataForOrigin', {
    origin: baseURL,
    storageTypes: 'local_storage,indexeddb,cache_storage,service_workers',
  });
  await session.detach();
  return { context, page };
}

async function closeIfIdle(one: Idle): Promise<void> {
  const place = idle.indexOf(one);
  if (place < 0) return;
  idle.splice(place, 1);
  await one.context.close();
}

/**
 * Debian's Chromium at one of the two sizes, as somebody has it who was never here. To start one and to read the program for the first time
 * costs more than most tests, so one that is closed is cleared and used again for the same address and size.
 */
export async function openBrowser(baseURL: string, size: Size, options: BrowserOptions = {}): Promise<Browser> {
  const key = `${size} ${baseURL}`;
  const ends = options.installs === true || options.film !== undefined;
  const { context, page } = await blankPage(baseURL, ends ? '' : key, () => launch(baseURL, size, options));
  page.setDefaultTimeout(30_000);
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
      if (ends) return context.close();
      await page.close();
      const one = { key, context };
      idle.push(one);
      setTimeout(() => void closeIfIdle(one), idleMs).unref();
    },
  };
}

const cameras = new WeakMap<Page, Promise<CDPSession>>();

/** Keeps a picture of the page as test output: some hundreds in a whole run, so each is taken at once and packed lightly. */
export async function shoot({ page, context, size }: Browser, name: string): Promise<void> {
  const camera = cameras.get(page) ?? context.newCDPSession(page);
  cameras.set(page, camera);
  const { data } = await (await camera).send('Page.captureScreenshot', { format: 'png', optimizeForSpeed: true });
  mkdirSync(screens, { recursive: true });
  writeFileSync(join(screens, `${name}-${size}.png`), Buffer.from(data, 'base64'));
}

/** Makes a picture of the documents anew, where that is asked for: a usual run leaves the tree as it is. */
export async function picture({ page }: Browser, name: string): Promise<void> {
  if (!keepsPictures) return;
  mkdirSync(pictures, { recursive: true });
  await page.screenshot({ path: join(pictures, `${name}.png`) });
}
