#!/usr/bin/env node
/** `npm test`: sets up all that the tests need, then checks, unit, contract, database and browser tests. Arguments go to Jest. */
import { mkdirSync, readFileSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root } from './lib/paths.mjs';
import { pass } from './lib/run.mjs';
import { say } from './lib/say.mjs';
import { ensureWebBuild } from './lib/web-build.mjs';

const args = process.argv.slice(2);
const whole = args.length === 0;
const start = Date.now();
await ensureNodeModules();
await ensureDebianPackages(['postgresql', 'chromium', 'socat']);
const output = join(root, 'test-output');
mkdirSync(output, { recursive: true });
const report = join(output, 'jest.json');
rmSync(report, { force: true });

let code = whole ? await pass(process.execPath, [join(root, 'scripts', 'check.mjs')], { cwd: root }) : 0;
if (code === 0) {
  await ensureWebBuild();
  const cluster = await startCluster('test');
  const env = { ...process.env, EVENFALL_DATABASE_ADMIN_URL: cluster.url('postgres'), TZ: 'UTC' };
  const jest = join(root, 'node_modules', 'jest', 'bin', 'jest.js');
  code = await pass(process.execPath, [jest, '--testTimeout=30000', '--json', `--outputFile=${report}`, ...args], { cwd: root, env });
  if (!cluster.wasRunning) await cluster.stop();
  const { numPassedTests, numFailedTests, numPendingTests } = JSON.parse(readFileSync(report, 'utf8'));
  say(`${((Date.now() - start) / 1000).toFixed(0)} s in all`);
  process.stdout.write(`${numPassedTests} passed, ${numFailedTests} failed, ${numPendingTests} skipped\n`);
}
process.exit(code);
