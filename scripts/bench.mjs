#!/usr/bin/env node
/** `npm run bench [-- NAME …]`: one JSON line for each measurement; nothing here is a test. */
import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root } from './lib/paths.mjs';
import { pass } from './lib/run.mjs';
import { giveUp, say } from './lib/say.mjs';
import { ensureWebBuild } from './lib/web-build.mjs';

const folder = join(root, 'scripts', 'bench');
const known = readdirSync(folder)
  .filter((name) => name.endsWith('.ts') && name !== 'report.ts')
  .map((name) => name.slice(0, -3))
  .sort();
const wanted = process.argv.slice(2);
const strange = wanted.filter((name) => !known.includes(name));
if (strange.length > 0) giveUp(`no benchmark called ${strange.join(', ')}; there are: ${known.join(', ')}`);

const chosen = wanted.length > 0 ? wanted : known;
await ensureNodeModules();
await ensureDebianPackages(['postgresql', ...(chosen.includes('web') ? ['chromium-headless-shell'] : [])]);
if (chosen.includes('web')) await ensureWebBuild();
const cluster = await startCluster('bench');
const env = { ...process.env, EVENFALL_DATABASE_ADMIN_URL: cluster.url('postgres') };
let code = 0;
for (const name of chosen) {
  const ended = await pass(process.execPath, ['--expose-gc', '--import', 'tsx', join(folder, `${name}.ts`)], { cwd: root, env });
  if (ended !== 0) say(`The benchmark ${name} failed.`);
  code ||= ended;
}
if (!cluster.wasRunning) await cluster.stop();
process.exit(code);
