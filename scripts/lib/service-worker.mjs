import { createHash } from 'node:crypto';
import { readdir, readFile, writeFile } from 'node:fs/promises';
import { join, sep } from 'node:path';

/** What never changes under its name: all that the bundler names by its content, and the fonts. */
const kept = /^\/(_expo\/static\/.*\.(js|css)|assets\/.*[.-][0-9a-f]{20,}\.[a-z0-9]+|fonts\/.*\.woff2)$/;
const unbuilt = "const build = { version: 'unbuilt', files: [] };";

/** Tells the service worker of a web build which files it keeps; another build is another version. */
export async function writeServiceWorker(folder) {
  const below = await readdir(folder, { recursive: true });
  const files = below
    .map((path) => `/${path.split(sep).join('/')}`)
    .filter((path) => kept.test(path))
    .sort();
  const path = join(folder, 'service-worker.js');
  const source = await readFile(path, 'utf8');
  if (!source.includes(unbuilt)) throw new Error('service-worker.js has no line for the version of the build');
  const version = createHash('sha256')
    .update(JSON.stringify([files, source, await readFile(join(folder, 'offline.html'), 'utf8')]))
    .digest('hex')
    .slice(0, 16);
  await writeFile(
    path,
    source.replace(unbuilt, () => `const build = ${JSON.stringify({ version, files })};`),
  );
}
