#!/usr/bin/env node
/**
 * Runs one of the commands that look after a lab's database: audit-verify, backup, restore. The database is that of DATABASE_URL; without it that of
 * `npm start`, which is started for the while where it does not run.
 */
import { join } from 'node:path';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root, state } from './lib/paths.mjs';
import { pass } from './lib/run.mjs';
import { giveUp } from './lib/say.mjs';

const programs = { 'audit-verify': ['audit-verify'], backup: ['backup', 'backup'], restore: ['backup', 'restore'] };
const [name, ...args] = process.argv.slice(2);
const [program, ...first] = programs[name] ?? giveUp(`unknown command ${name}: ${Object.keys(programs).join(', ')}`);
await ensureNodeModules();
const own = process.env.DATABASE_URL === undefined || process.env.DATABASE_URL === '' ? await ownDatabase() : null;
process.exitCode = await pass(
  process.execPath,
  ['--import', join(root, 'node_modules/tsx/dist/loader.mjs'), join(root, 'server', 'boot', `${program}.ts`), ...first, ...args],
  {
    cwd: process.env.INIT_CWD ?? process.cwd(),
    env: {
      EVENFALL_STATE_DIR: state,
      ...process.env,
      ...(own === null ? {} : { DATABASE_URL: own.url }),
      TSX_TSCONFIG_PATH: join(root, 'tsconfig.json'),
    },
  },
);
if (own !== null && !own.cluster.wasRunning) await own.cluster.stop();

async function ownDatabase() {
  await ensureDebianPackages(['postgresql']);
  const cluster = await startCluster('lab');
  return { cluster, url: await cluster.ensureDatabase('evenfall') };
}
