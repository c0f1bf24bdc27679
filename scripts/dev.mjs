#!/usr/bin/env node
/** `npm run dev`: the server restarts and the web application reloads on change. */
import { spawn } from 'node:child_process';
import { mkdirSync } from 'node:fs';
import { join } from 'node:path';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root, state } from './lib/paths.mjs';
import { freePort } from './lib/ports.mjs';
import { say } from './lib/say.mjs';
import { expoEnvironment } from './lib/web-build.mjs';

mkdirSync(state, { recursive: true });
await ensureNodeModules();
await ensureDebianPackages(['postgresql']);
const cluster = await startCluster('lab');
const databaseUrl = await cluster.ensureDatabase('evenfall');
const apiPort = String(await freePort());
const webPort = process.env.PORT ?? String(await freePort());
const env = { ...process.env, DATABASE_URL: databaseUrl, PORT: apiPort, EVENFALL_DEMO: '1', EVENFALL_STATE_DIR: state };

const children = [
  spawn(
    process.execPath,
    [
      '--watch-path=server',
      '--watch-path=shared',
      '--watch-path=db',
      '--watch-path=firmware-protocol',
      '--import',
      'tsx',
      'server/boot/main.ts',
    ],
    { cwd: root, stdio: 'inherit', env },
  ),
  spawn(process.execPath, [join(root, 'node_modules/expo/bin/cli'), 'start', '--web', '--port', webPort], {
    cwd: root,
    stdio: 'inherit',
    env: { ...process.env, ...expoEnvironment, CI: '', BROWSER: 'none', EVENFALL_API_PORT: apiPort },
  }),
];
say(`The application with reload: http://127.0.0.1:${webPort} (its API on port ${apiPort}). Ctrl-C ends both.`);

let ending = false;
const end = () => {
  if (ending) return;
  ending = true;
  for (const child of children) child.kill('SIGTERM');
};
process.on('SIGINT', end);
process.on('SIGTERM', end);
await Promise.race(children.map((child) => new Promise((resolve) => child.on('close', resolve))));
end();
await Promise.all(
  children.map((child) =>
    child.exitCode === null && child.signalCode === null ? new Promise((resolve) => child.on('close', resolve)) : null,
  ),
);
await cluster.stop();
