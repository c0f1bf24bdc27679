#!/usr/bin/env node
/** `npm run icons`: draws the icons of the installed application from public/icon.svg, with the browser of the tests. */
import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { ensureDebianPackages } from './lib/debian.mjs';
import { root } from './lib/paths.mjs';

/** A launcher may cut away all but a circle of 0.4 of the width about the middle (W3C Web Application Manifest, maskable icons). */
const safeScale = 0.88;

const icons = [
  { name: 'icon-192', px: 192 },
  { name: 'icon-512', px: 512 },
  { name: 'maskable-512', px: 512, full: true },
];

await ensureDebianPackages(['chromium']);
const { chromium } = await import('playwright-core');
const mark = readFileSync(join(root, 'public', 'icon.svg'), 'utf8');

/** The same mark, smaller, on a ground that reaches every edge. */
const onFullGround = (svg) => {
  const [, ground, rest] = /^<svg[^>]*>(<rect[^>]*\/>)(.*)<\/svg>$/s.exec(svg.trim());
  const shift = 32 * (1 - safeScale);
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 64 64">${ground.replace(/ rx="\d+"/, '')}<g transform="translate(${shift} ${shift}) scale(${safeScale})">${rest}</g></svg>`;
};

const folder = join(root, 'public', 'icons');
mkdirSync(folder, { recursive: true });
const browser = await chromium.launch({ executablePath: '/usr/bin/chromium', args: ['--no-sandbox', '--disable-gpu'] });
for (const { name, px, full = false } of icons) {
  const page = await browser.newPage({ viewport: { width: px, height: px } });
  const svg = (full ? onFullGround(mark) : mark).replace('<svg ', `<svg width="${px}" height="${px}" `);
  await page.setContent(`<style>body { margin: 0 } svg { display: block }</style>${svg}`);
  writeFileSync(join(folder, `${name}.png`), await page.screenshot({ omitBackground: true }));
  await page.close();
}
await browser.close();
