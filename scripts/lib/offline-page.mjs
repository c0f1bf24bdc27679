import { readFile, rm, writeFile } from 'node:fs/promises';
import { join } from 'node:path';

/** Where nothing else can be fetched, the page for it has to carry all that it needs; the content security policy knows what it carries by hash. */

const styles = /<link rel="stylesheet" href="\/([^"]*)" \/>/g;
const programs = /<script src="\/([^"]*)"><\/script>/g;

async function replaceAll(text, pattern, make) {
  const found = await Promise.all([...text.matchAll(pattern)].map(async ([whole, name]) => [whole, await make(name)]));
  return found.reduce((changed, [whole, made]) => changed.replace(whole, () => made), text);
}

/** Puts style sheets and scripts into offline.html of a web build. */
export async function writeOfflinePage(folder) {
  const path = join(folder, 'offline.html');
  const inside = async (name) => (await readFile(join(folder, name), 'utf8')).trim();
  const html = await readFile(path, 'utf8');
  const styled = await replaceAll(html, styles, async (name) => `<style>${await inside(name)}</style>`);
  await writeFile(path, await replaceAll(styled, programs, async (name) => `<script>${await inside(name)}</script>`));
  for (const own of ['offline.css', 'offline.js']) await rm(join(folder, own));
}
