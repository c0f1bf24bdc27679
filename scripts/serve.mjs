#!/usr/bin/env node
/**
 * The server as one process, configured by its environment (docs/operations.md): built into one file first unless that is done already. Where that cannot
 * be done it is run file by file, which takes half a second longer. `--prepare` builds and ends.
 */
import { createRequire } from 'node:module';
import { join } from 'node:path';
import { root } from './lib/paths.mjs';
import { ensureServerBuild } from './lib/server-build.mjs';

const require = createRequire(import.meta.url);

/** The folder of the build; null where it could not be built, which keeps no server from running. */
async function folderOfBuild() {
  try {
    return await ensureServerBuild();
  } catch (error) {
    if (process.argv.includes('--prepare')) throw error;
    process.stderr.write(`The server is run file by file, for it could not be built into one: ${String(error?.message ?? error)}\n`);
    return null;
  }
}

const folder = await folderOfBuild();
if (!process.argv.includes('--prepare')) {
  if (folder === null) {
    await import('tsx');
    require(join(root, 'server', 'boot', 'main.ts'));
  } else {
    process.setSourceMapsEnabled(true);
    require(join(folder, 'main.js'));
  }
}
