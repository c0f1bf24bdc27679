#!/usr/bin/env node
/**
 * The server as one process, configured by its environment (docs/operations.md): built into one file first unless that is done already. Where nothing can be
 * written it is run file by file, which takes half a second longer. `--prepare` builds and ends.
 */
import { createRequire } from 'node:module';
import { join } from 'node:path';
import { root } from './lib/paths.mjs';
import { ensureServerBuild } from './lib/server-build.mjs';

const require = createRequire(import.meta.url);
const cannotWrite = new Set(['EACCES', 'EPERM', 'EROFS', 'ENOSPC']);

async function folderOfBuild() {
  try {
    return await ensureServerBuild();
  } catch (error) {
    if (!cannotWrite.has(error.code) || process.argv.includes('--prepare')) throw error;
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
