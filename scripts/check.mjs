#!/usr/bin/env node
/** `npm run check`: format, lint, types, house rules, dead code. `--fix` repairs what can be repaired; `--beside-tests`: the tests hold the house rules. */
import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root } from './lib/paths.mjs';
import { run } from './lib/run.mjs';
import { say } from './lib/say.mjs';
import { ensureTypeFiles } from './lib/type-files.mjs';

await ensureNodeModules();
await ensureTypeFiles();
const fix = process.argv.includes('--fix');
const bin = (name) => join(root, 'node_modules', '.bin', name);
/** What was right stays right until the file changes; a clean clone has none of it and checks everything. */
const kept = (name) => join(root, '.state', 'checked', name);
const nativeCompiler = join(root, 'node_modules', 'typescript-native', 'bin', 'tsc');
mkdirSync(kept('.'), { recursive: true });
const cached = (name) => ['--cache', '--cache-location', kept(name), '--cache-strategy', 'content'];
const steps = [
  ['format', bin('prettier'), ['--log-level', 'warn', fix ? '--write' : '--check', ...cached('prettier'), '.']],
  ['lint', bin('eslint'), ['--max-warnings', '0', ...cached('eslint'), ...(fix ? ['--fix'] : []), '.']],
  // The native compiler finds what the other one finds in a third of its time; lint needs the other one's interface.
  [
    'types',
    process.execPath,
    [nativeCompiler, '--noEmit', '-p', '.', '--singleThreaded', '--incremental', '--tsBuildInfoFile', kept('types')],
  ],
  ['house rules', bin('jest'), ['tests/house', '--silent', '--selectProjects', 'node']],
  ['dead code', bin('knip'), ['--no-progress']],
];
const besideTests = process.argv.includes('--beside-tests');
const failed = [];

async function step([name, command, args]) {
  const start = Date.now();
  const { code, stdout, stderr } = await run(command, args, { cwd: root });
  if (code !== 0) say(`${stdout}${stderr}`.trim());
  say(`${code === 0 ? 'ok  ' : 'FAIL'} ${name} (${((Date.now() - start) / 1000).toFixed(1)} s)`);
  if (code !== 0) failed.push(name);
}

async function inTurn(some) {
  for (const one of some) await step(one);
}

const others = steps.filter(([name]) => name !== 'lint' && !(besideTests && name === 'house rules'));
// Linting takes as long as all the others together: two at a time.
await Promise.all([inTurn(steps.filter(([name]) => name === 'lint')), inTurn(others)]);
if (failed.length > 0) say(`Failed: ${failed.join(', ')}.`);
process.exit(failed.length === 0 ? 0 : 1);
