import { spawn } from 'node:child_process';
import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createInterface } from 'node:readline';
import { gzipSync } from 'node:zlib';
import { chromium } from 'playwright-core';
import { report } from './report';

/** First load of the sign-in page of the built application: bytes, and how it feels on a slow phone (1.6 Mbit/s, 150 ms, CPU 4×). */

interface Paint {
  lcpMs: number;
  cls: number;
}

const root = join(__dirname, '..', '..');
const folder = mkdtempSync(join(tmpdir(), 'evenfall-bench-web-'));
const server = spawn(process.execPath, ['--import', 'tsx', 'server/boot/main.ts'], {
  cwd: root,
  stdio: ['ignore', 'pipe', 'inherit'],
  env: { ...process.env, NODE_ENV: 'production', DATABASE_URL: process.env.EVENFALL_BENCH_DATABASE_URL, PORT: '0', EVENFALL_STATE_DIR: folder, EVENFALL_LOG_LEVEL: 'error' },
});
const address = await new Promise<string>((resolve, reject) => {
  server.on('close', () => reject(new Error('the server ended before it listened')));
  createInterface({ input: server.stdout }).on('line', (line) => {
    const at = /"listening":\s*"([^"]+)"/.exec(line)?.[1];
    if (at !== undefined) resolve(at);
  });
});

const context = await chromium.launchPersistentContext(join(folder, 'profile'), {
  executablePath: '/usr/bin/chromium',
  headless: true,
  args: ['--no-sandbox', '--disable-gpu', '--disable-quic', '--no-first-run', '--disable-background-networking', '--disable-component-update', '--disable-sync'],
  viewport: { width: 390, height: 844 },
  isMobile: true,
  hasTouch: true,
});
const page = await context.newPage();
const scripts = new Set<string>();
const fonts = new Set<string>();
page.on('response', (response) => {
  const path = new URL(response.url()).pathname;
  if (path.endsWith('.js')) scripts.add(path);
  if (path.endsWith('.woff2')) fonts.add(path);
});
const client = await context.newCDPSession(page);
await client.send('Network.enable');
await client.send('Network.emulateNetworkConditions', { offline: false, latency: 150, downloadThroughput: 200_000, uploadThroughput: 93_750 });
await client.send('Emulation.setCPUThrottlingRate', { rate: 4 });
await page.addInitScript({
  content: `globalThis.__paint = { lcpMs: 0, cls: 0 };
    new PerformanceObserver((list) => { for (const entry of list.getEntries()) __paint.lcpMs = entry.startTime; }).observe({ type: 'largest-contentful-paint', buffered: true });
    new PerformanceObserver((list) => { for (const entry of list.getEntries()) if (!entry.hadRecentInput) __paint.cls += entry.value; }).observe({ type: 'layout-shift', buffered: true });`,
});
await page.goto(`${address}/sign-in`);
await page.getByRole('button', { name: /sign in/i }).waitFor();
await page.waitForLoadState('networkidle');
const paint = await page.evaluate<Paint>('globalThis.__paint');
await context.close();
server.kill('SIGTERM');
rmSync(folder, { recursive: true, force: true });

const kib = (paths: Iterable<string>, packed: boolean) =>
  [...paths].reduce((sum, path) => {
    const bytes = readFileSync(join(root, 'dist', path));
    return sum + (packed ? gzipSync(bytes, { level: 9 }).length : bytes.length);
  }, 0) / 1024;
const bundles = readdirSync(join(root, 'dist/_expo/static/js/web')).map((name) => `_expo/static/js/web/${name}`);
report({ name: 'web javascript', value: kib(scripts, true), unit: 'KiB gz', goal: 350, want: 'at most', peer: kib(bundles, true) });
report({ name: 'web fonts', value: kib(fonts, false), unit: 'KiB', goal: 60, want: 'at most', peer: null });
report({ name: 'web largest-contentful-paint', value: paint.lcpMs / 1000, unit: 's', goal: 2.5, want: 'at most', peer: null });
report({ name: 'web layout-shift', value: paint.cls, unit: '1', goal: 0.02, want: 'at most', peer: null });
