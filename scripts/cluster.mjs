#!/usr/bin/env node
/** `node scripts/cluster.mjs url` starts the private test cluster if need be and prints its address; `stop` ends it. */
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { giveUp } from './lib/say.mjs';

await ensureDebianPackages(['postgresql']);
const cluster = await startCluster('test');
const act = process.argv[2];
if (act === 'url') process.stdout.write(`${cluster.url('postgres')}\n`);
else if (act === 'stop') await cluster.stop();
else giveUp('usage: node scripts/cluster.mjs url | stop');
