import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { chromium, type BrowserContext } from 'playwright-core';
import { withDatabase } from './lib/fresh-database';
import { ServerProcess } from './lib/server-process';
import { report } from './report';

/** First load of the sign-in page of the built application: bytes, and how it feels on a slow phone (1.6 Mbit/s, 150 ms, CPU 4×). */

interface Paint {
  lcpMs: number;
  cls: number;
}

interface Loaded extends Paint {
  /** Paths of what came. */
  scripts: Set<string>;
  fonts: Set<string>;
}

const dist = join(__dirname, '..', '..', 'dist');
const quiet = ['--disable-background-networking', '--disable-component-update', '--disable-sync', '--no-first-run'];

const openPhone = (profile: string): Promise<BrowserContext> =>
  chromium.launchPersistentContext(profile, {
    executablePath: '/usr/bin/chromium',
    headless: true,
    args: ['--no-sandbox', '--disable-gpu', '--disable-quic', ...quiet],
    viewport: { width: 390, height: 844 },
    isMobile: true,
    hasTouch: true,
  });

async function load(phone: BrowserContext, address: string): Promise<Loaded> {
  const page = await phone.newPage();
  const [scripts, fonts] = [new Set<string>(), new Set<string>()];
  page.on('response', (response) => {
    const path = new URL(response.url()).pathname;
    if (path.endsWith('.js')) scripts.add(path);
    if (path.endsWith('.woff2')) fonts.add(path);
  });
  const client = await phone.newCDPSession(page);
  await client.send('Network.enable');
  await client.send('Network.emulateNetworkConditions', {
    offline: false,
    latency: 150,
    downloadThroughput: 200_000,
    uploadThroughput: 93_750,
  });
  await client.send('Emulation.setCPUThrottlingRate', { rate: 4 });
  await page.addInitScript({
    content: `globalThis.__paint = { lcpMs: 0, cls: 0 };
    new PerformanceObserver((list) => { for (const entry of list.getEntries()) __paint.lcpMs = entry.startTime; }).observe({ type: 'largest-contentful-paint', buffered: true });
    new PerformanceObserver((list) => { for (const entry of list.getEntries()) if (!entry.hadRecentInput) __paint.cls += entry.value; }).observe({ type: 'layout-shift', buffered: true });`,
  });
  await page.goto(`${address}/sign-in`);
  await page.getByRole('button', { name: /sign in/i }).waitFor();
  await page.waitForLoadState('networkidle');
  return { scripts, fonts, ...(await page.evaluate<Paint>('globalThis.__paint')) };
}

const kib = (paths: Iterable<string>, packed: boolean) =>
  [...paths].reduce((sum, path) => {
    const bytes = readFileSync(join(dist, path));
    return sum + (packed ? gzipSync(bytes, { level: 9 }).length : bytes.length);
  }, 0) / 1024;

function tell({ scripts, fonts, lcpMs, cls }: Loaded): void {
  const all = readdirSync(join(dist, '_expo/static/js/web'))
    .filter((name) => name.endsWith('.js'))
    .map((name) => `_expo/static/js/web/${name}`);
  report({ name: 'web javascript', value: kib(scripts, true), unit: 'KiB gz', goal: 350, want: 'at most', peer: kib(all, true) });
  report({ name: 'web fonts', value: kib(fonts, false), unit: 'KiB', goal: 60, want: 'at most', peer: null });
  report({ name: 'web largest-contentful-paint', value: lcpMs / 1000, unit: 's', goal: 2.5, want: 'at most', peer: null });
  report({ name: 'web layout-shift', value: cls, unit: '1', goal: 0.02, want: 'at most', peer: null });
}

async function run(): Promise<void> {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-bench-web-'));
  try {
    await withDatabase(async ({ url }) => {
      const server = await ServerProcess.start({ databaseUrl: url, stateDir: folder, env: { EVENFALL_WEB_DIR: 'dist' } });
      const phone = await openPhone(join(folder, 'profile'));
      try {
        tell(await load(phone, server.address));
      } finally {
        await phone.close();
        await server.end();
      }
    });
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

void run();
