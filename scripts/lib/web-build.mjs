import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readFileSync, readdirSync, renameSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { writeOfflinePage } from './offline-page.mjs';
import { root, state } from './paths.mjs';
import { precompress } from './precompress.mjs';
import { must } from './run.mjs';
import { say, waiting } from './say.mjs';
import { writeServiceWorker } from './service-worker.mjs';

const config = ['app.json', 'babel.config.js', 'metro.config.js', 'tailwind.config.js', 'tsconfig.json', 'package-lock.json'];
const builders = [
  'web-build.mjs',
  'first-page.mjs',
  'offline-page.mjs',
  'service-worker.mjs',
  'web-cuts.cjs',
  'no-native-stack.cjs',
  'minifier.cjs',
  'precompress.mjs',
].map((name) => join('scripts', 'lib', name));
const sources = ['app', 'components', 'shared', 'assets', 'public', 'global.css', ...config, ...builders];
const stamp = join(state, 'web-build');

function addTo(hash, path) {
  if (!existsSync(path)) return;
  if (statSync(path).isDirectory()) {
    for (const name of readdirSync(path).sort()) addTo(hash, join(path, name));
    return;
  }
  hash.update(path.slice(root.length)).update('\0').update(readFileSync(path)).update('\0');
}

/** Environment in which Expo neither asks for the network nor reports anything. */
export const expoEnvironment = { EXPO_OFFLINE: '1', EXPO_NO_TELEMETRY: '1', EXPO_NO_DEPENDENCY_VALIDATION: '1', CI: '1' };

/** Builds the web application into dist/, unless its sources are those of the last build. */
export async function ensureWebBuild() {
  const hash = createHash('sha256');
  for (const source of sources) addTo(hash, join(root, source));
  const digest = hash.digest('hex');
  if (existsSync(join(root, 'dist', 'index.html')) && existsSync(stamp) && readFileSync(stamp, 'utf8') === digest) return;
  say('Building the web application (about a minute; again only when its sources change).');
  const fresh = join(state, 'web-new');
  rmSync(fresh, { recursive: true, force: true });
  mkdirSync(state, { recursive: true });
  const expo = join(root, 'node_modules', 'expo', 'bin', 'cli');
  await waiting('waiting for the web build', () =>
    must(process.execPath, [expo, 'export', '--platform', 'web', '--output-dir', fresh], {
      cwd: root,
      env: { ...process.env, ...expoEnvironment },
    }),
  );
  // Loaded only now: a bare clone has no packages when this file is read.
  const { writeFirstPage } = await import('./first-page.mjs');
  await writeFirstPage(fresh);
  await writeOfflinePage(fresh);
  await writeServiceWorker(fresh);
  await precompress(fresh);
  rmSync(join(root, 'dist'), { recursive: true, force: true });
  renameSync(fresh, join(root, 'dist'));
  writeFileSync(stamp, digest);
}
