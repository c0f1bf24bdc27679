import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { chromium, type BrowserContext } from 'playwright-core';
import { themeNames } from '@/components/theme/tokens';
import { withDatabase } from './lib/fresh-database';
import { ServerProcess } from './lib/server-process';
import { report } from './report';

/** First load of the sign-in page of the built application: bytes, and how it feels on a slow phone (1.6 Mbit/s, 150 ms, CPU 4×) in the worst of the three themes. */

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
    executablePath: '/usr/bin/chromium-headless-shell',
    headless: true,
    args: ['--no-sandbox', '--disable-gpu', '--disable-quic', ...quiet],
    viewport: { width: 390, height: 844 },
    isMobile: true,
    hasTouch: true,
  });

async function load(phone: BrowserContext, { address, theme }: { address: string; theme: string }): Promise<Loaded> {
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
    content: `localStorage.setItem('evenfall.theme', '${theme}');
    globalThis.__paint = { lcpMs: 0, cls: 0 };
    new PerformanceObserver((list) => { for (const entry of list.getEntries()) __paint.lcpMs = entry.startTime; }).observe({ type: 'largest-contentful-paint', buffered: true });
    new PerformanceObserver((list) => { for (const entry of list.getEntries()) if (!entry.hadRecentInput) __paint.cls += entry.value; }).observe({ type: 'layout-shift', buffered: true });`,
  });
  await page.goto(`${address}/sign-in`);
  // The page is there before its program: what counts is read when the program has taken the form over, answers, and nothing more comes.
  await page.locator('#root:not([data-early])').waitFor();
  await page.getByTestId('sign-in').click();
  await page.getByRole('alert').first().waitFor();
  await page.waitForLoadState('networkidle');
  const paint = await page.evaluate<Paint>('globalThis.__paint');
  await page.close();
  return { scripts, fonts, ...paint };
}

const kib = (paths: Iterable<string>, packed: boolean) =>
  [...paths].reduce((sum, path) => {
    const bytes = readFileSync(join(dist, path));
    return sum + (packed ? gzipSync(bytes, { level: 9 }).length : bytes.length);
  }, 0) / 1024;

function tell(loads: readonly Loaded[]): void {
  const { scripts, fonts } = loads[0] as Loaded;
  const worst = (paint: keyof Paint) => Math.max(...loads.map((load) => load[paint]));
  const all = readdirSync(join(dist, '_expo/static/js/web'))
    .filter((name) => name.endsWith('.js'))
    .map((name) => `_expo/static/js/web/${name}`);
  report({ name: 'web javascript', value: kib(scripts, true), unit: 'KiB gz', goal: 350, want: 'at most', peer: kib(all, true) });
  report({ name: 'web fonts', value: kib(fonts, false), unit: 'KiB', goal: 60, want: 'at most', peer: null });
  report({ name: 'web largest-contentful-paint', value: worst('lcpMs') / 1000, unit: 's', goal: 2.5, want: 'at most', peer: null });
  report({ name: 'web layout-shift', value: worst('cls'), unit: '1', goal: 0.02, want: 'at most', peer: null });
}

async function run(): Promise<void> {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-bench-web-'));
  try {
    await withDatabase(async ({ url }) => {
      const server = await ServerProcess.start({ databaseUrl: url, stateDir: folder, env: { EVENFALL_WEB_DIR: 'dist' } });
      try {
        const loads: Loaded[] = [];
        for (const theme of themeNames) {
          // A profile of its own each time: nothing is in its cache.
          const phone = await openPhone(join(folder, theme));
          loads.push(await load(phone, { address: server.address, theme }));
          await phone.close();
        }
        tell(loads);
      } finally {
        await server.end();
      }
    });
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

void run();
