#!/usr/bin/env node
/** `npm start`: everything from a bare clone to a running demo lab, and a clean end on Ctrl-C. */
import { spawn } from 'node:child_process';
import { existsSync, mkdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join, relative } from 'node:path';
import { createInterface } from 'node:readline';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root, state } from './lib/paths.mjs';
import { freePort, isFree } from './lib/ports.mjs';
import { giveUp, say, waiting } from './lib/say.mjs';
import { ensureWebBuild } from './lib/web-build.mjs';

const usualPort = 4460;
const lock = join(state, 'running.json');

refuseSecondStart();
mkdirSync(state, { recursive: true });
await ensureNodeModules();
await ensureDebianPackages(['postgresql']);
await ensureWebBuild();
const cluster = await startCluster('lab');
const databaseUrl = await cluster.ensureDatabase('evenfall');
const port = process.env.PORT ?? String((await isFree(usualPort)) ? usualPort : await freePort());

const server = spawn(process.execPath, ['scripts/serve.mjs'], {
  cwd: root,
  stdio: ['ignore', 'pipe', 'inherit'],
  env: { ...process.env, NODE_ENV: 'production', DATABASE_URL: databaseUrl, PORT: port, EVENFALL_DEMO: '1', EVENFALL_STATE_DIR: state },
});
writeFileSync(lock, JSON.stringify({ pid: process.pid, port }));

let ending = false;
const end = () => {
  if (ending) return;
  ending = true;
  say('\nEnding …');
  server.kill('SIGTERM');
};
process.on('SIGINT', end);
process.on('SIGTERM', end);
process.on('SIGHUP', end);

const ended = new Promise((resolve) => server.on('close', (code, signal) => resolve(code ?? signal)));
const listening = new Promise((resolve) => {
  createInterface({ input: server.stdout }).on('line', (line) => {
    const said = parse(line);
    if (said?.listening) resolve(said);
    else say(line);
  });
});

const first = await waiting('waiting for the server to migrate, seed and listen', () => Promise.race([listening, ended]));
if (typeof first === 'object' && first !== null) welcome(first);
const code = await ended;
await cluster.stop();
rmSync(lock, { force: true });
if (!ending) say(`The server ended by itself (${code}); its last words are above.`);
process.exit(ending ? 0 : typeof code === 'number' ? code : 1);

function welcome({ listening: address, signIns = [], mailbox }) {
  say(`\nEvenfall is at ${address}\n`);
  if (signIns.length > 0) {
    say(`Demo sign-ins (password ${signIns[0].password}):`);
    for (const { email, role } of signIns) say(`  ${email.padEnd(32)} ${role}`);
  }
  if (mailbox) say(`Mail that the demo lab sends is kept in ${relative(process.cwd(), mailbox)}`);
  say('\nCtrl-C ends it; the data stay.');
}

function parse(line) {
  try {
    return JSON.parse(line);
  } catch {
    return null;
  }
}

function refuseSecondStart() {
  if (!existsSync(lock)) return;
  const { pid, port: taken } = JSON.parse(readFileSync(lock, 'utf8'));
  try {
    process.kill(pid, 0);
  } catch {
    return;
  }
  giveUp(`Evenfall is running here already: http://127.0.0.1:${taken} (process ${pid}).`);
}
