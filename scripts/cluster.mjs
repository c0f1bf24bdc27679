#!/usr/bin/env node
/**
 * `node scripts/cluster.mjs url [NAME]` starts a private cluster if need be (`test` without a name) and prints its address; `stop` ends it,
 * `crash` ends it as a power cut would.
 */
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { giveUp } from './lib/say.mjs';

await ensureDebianPackages(['postgresql']);
const [act, name = 'test'] = process.argv.slice(2);
const cluster = await startCluster(name);
if (act === 'url') process.stdout.write(`${cluster.url('postgres')}\n`);
else if (act === 'stop') await cluster.stop();
else if (act === 'crash') await cluster.crash();
else giveUp('usage: node scripts/cluster.mjs url | stop | crash [NAME]');
