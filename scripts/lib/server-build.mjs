import { createHash } from 'node:crypto';
import { existsSync, mkdirSync, readFileSync, readdirSync, renameSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { root, state } from './paths.mjs';

/**
 * The server's hundreds of files in one, so that a server that was killed is back sooner: read one by one they cost half a second of its start.
 * Each thread has a file of its own beside the server's.
 */
const entries = ['main', 'board-thread', 'trials-worker', 'watchdog-thread', 'worker-thread'].map((name) => `server/boot/${name}.ts`);
const builders = ['scripts/lib/server-build.mjs', 'tsconfig.json', 'package-lock.json'];
/** A server that runs begins its threads from the build it was started from. */
const KEPT = 4;

/** What tells whether a file is still the one that was built: its size in bytes and its time of change, ms. */
function markOf(base, path) {
  const at = statSync(join(base, path), { throwIfNoEntry: false });
  return at === undefined ? null : [path, at.size, at.mtimeMs];
}

const isSame = (base, mark) => JSON.stringify(markOf(base, mark[0])) === JSON.stringify(mark);

/** Files of the project say where they lie; in the build they would all lie in one place. */
const placeOfEachFile = {
  name: 'place-of-each-file',
  setup(build) {
    build.onLoad({ filter: /\.ts$/ }, ({ path }) => {
      const text = readFileSync(path, 'utf8');
      return text.includes('__dirname') ? { contents: text.replaceAll('__dirname', JSON.stringify(dirname(path))), loader: 'ts' } : null;
    });
  },
};

async function build({ base, folder, files }) {
  // Loaded only here: a build that is still right needs none of it.
  const esbuild = await import('esbuild');
  const { metafile } = await esbuild.build({
    absWorkingDir: base,
    entryPoints: files,
    outdir: folder,
    entryNames: '[name]',
    bundle: true,
    platform: 'node',
    target: 'node20',
    format: 'cjs',
    packages: 'external',
    sourcemap: 'linked',
    keepNames: true,
    metafile: true,
    logLevel: 'silent',
    plugins: [placeOfEachFile],
  });
  return Object.keys(metafile.inputs).filter((path) => existsSync(join(base, path)));
}

/** Writes as a whole: another process may build or read at the same time. */
function put(path, text) {
  const fresh = `${path}.${process.pid}`;
  writeFileSync(fresh, text);
  renameSync(fresh, path);
}

function forgetOld(kept) {
  const builds = readdirSync(kept).filter((name) => /^[0-9a-f]{16}$/.test(name));
  const changedMs = (folder) => statSync(folder, { throwIfNoEntry: false })?.mtimeMs ?? 0;
  const newestFirst = builds.map((name) => join(kept, name)).sort((one, other) => changedMs(other) - changedMs(one));
  for (const folder of newestFirst.slice(KEPT)) rmSync(folder, { recursive: true, force: true });
}

/** What the last build was made of; null where there is none, or its note is no whole one. */
function lastBuild(note) {
  try {
    const last = JSON.parse(readFileSync(note, 'utf8'));
    return typeof last?.folder === 'string' && Array.isArray(last.inputs) ? last : null;
  } catch {
    return null;
  }
}

/** Puts the build into its place; another process may have put the same there meanwhile. */
function place(fresh, folder) {
  try {
    renameSync(fresh, folder);
  } catch (error) {
    if (!existsSync(folder)) throw error;
    rmSync(fresh, { recursive: true, force: true });
  }
}

/**
 * Builds the server unless its files are those of the last build.
 * @returns the folder of the build
 * @throws Error where a file cannot be built, or nothing can be written there
 */
export async function ensureServerBuild({ base = root, kept = join(state, 'server'), files = entries } = {}) {
  const note = join(kept, 'build.json');
  const last = lastBuild(note);
  if (last !== null && existsSync(join(kept, last.folder)) && last.inputs.every((mark) => isSame(base, mark)))
    return join(kept, last.folder);
  mkdirSync(kept, { recursive: true });
  const fresh = join(kept, `new-${process.pid}`);
  try {
    const paths = await build({ base, folder: fresh, files });
    const inputs = [...paths, ...builders.filter((path) => existsSync(join(base, path)))].map((path) => markOf(base, path));
    const name = createHash('sha256').update(JSON.stringify(inputs)).digest('hex').slice(0, 16);
    place(fresh, join(kept, name));
    put(note, JSON.stringify({ folder: name, inputs }));
    forgetOld(kept);
    return join(kept, name);
  } catch (error) {
    rmSync(fresh, { recursive: true, force: true });
    throw error;
  }
}
