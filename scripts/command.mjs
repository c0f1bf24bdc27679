#!/usr/bin/env node
/** Runs one of the commands that need no server: evaluate, rehearse, plan. */
import { join } from 'node:path';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root } from './lib/paths.mjs';
import { pass } from './lib/run.mjs';
import { giveUp } from './lib/say.mjs';

const [name, ...args] = process.argv.slice(2);
if (!['evaluate', 'rehearse', 'plan'].includes(name)) giveUp(`unknown command ${name}: evaluate, rehearse or plan`);
await ensureNodeModules();
const cwd = process.env.INIT_CWD ?? process.cwd();
process.exitCode = await pass(
  process.execPath,
  ['--import', join(root, 'node_modules/tsx/dist/loader.mjs'), join(root, 'server', 'boot', `${name}.ts`), ...args],
  {
    cwd,
    env: { ...process.env, TSX_TSCONFIG_PATH: join(root, 'tsconfig.json') },
  },
);
