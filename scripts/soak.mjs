#!/usr/bin/env node
/**
 * `npm run soak -- NAME … [--second]`: long runs with faults from seeds; each leaves `docs/soak/NAME.json`. `--second` takes the
 * greater figure. Whatever else begins with `--`, and its value, goes to the run, which then is a part only and leaves no result.
 */
import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root } from './lib/paths.mjs';
import { pass } from './lib/run.mjs';
import { giveUp, say } from './lib/say.mjs';

const folder = join(root, 'scripts', 'soak');
const known = readdirSync(folder)
  .filter((name) => name.endsWith('.ts') && name !== 'report.ts')
  .map((name) => name.slice(0, -3))
  .sort();
const args = process.argv.slice(2);
const firstOption = args.findIndex((arg) => arg.startsWith('--'));
const names = firstOption < 0 ? args : args.slice(0, firstOption);
const options = firstOption < 0 ? [] : args.slice(firstOption);
const notBuilt = {
  r12: 'the soak r12 is not built: there is no mutation testing yet. The matrix of roles and the tampering with the audit chain are tests: npm test -- tests/contract/http/roles.test.ts tests/server/boot/audit-verify.test.ts',
};
for (const name of names) if (Object.hasOwn(notBuilt, name)) giveUp(notBuilt[name]);
const strange = names.filter((name) => !known.includes(name));
if (strange.length > 0) giveUp(`no soak called ${strange.join(', ')}; there are: ${known.join(', ')}`);

await ensureNodeModules();
const chosen = names.length > 0 ? names : known;
const onDatabase = chosen.some((name) => ['r3', 'r5', 'r7'].includes(name));
if (onDatabase) await ensureDebianPackages(['postgresql']);
const cluster = onDatabase ? await startCluster('bench') : null;
const env = { ...process.env, ...(cluster === null ? {} : { EVENFALL_DATABASE_ADMIN_URL: cluster.url('postgres') }) };
let code = 0;
for (const name of chosen) {
  const ended = await pass(process.execPath, ['--import', 'tsx', join(folder, `${name}.ts`), ...options], { cwd: root, env });
  if (ended !== 0) say(`The soak ${name} failed.`);
  code ||= ended;
}
if (cluster !== null && !cluster.wasRunning) await cluster.stop();
process.exit(code);
