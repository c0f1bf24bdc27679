import { createHash } from 'node:crypto';
import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { root } from './paths.mjs';
import { must } from './run.mjs';
import { giveUp, say, waiting } from './say.mjs';

const stamp = join(root, 'node_modules', '.evenfall-lock');

function lockDigest() {
  return createHash('sha256').update(readFileSync(join(root, 'package-lock.json'))).digest('hex');
}

/** Installs what package-lock.json names, unless node_modules already holds exactly that. */
export async function ensureNodeModules() {
  const [major] = process.versions.node.split('.').map(Number);
  if (major !== 20) giveUp(`Evenfall runs on Node.js 20; this is ${process.versions.node}.`);
  const digest = lockDigest();
  if (existsSync(stamp) && readFileSync(stamp, 'utf8') === digest) return;
  say('Installing the packages of package-lock.json (about a minute the first time).');
  await waiting('waiting for npm ci', () => must('npm', ['ci', '--no-audit', '--no-fund'], { cwd: root }));
  writeFileSync(stamp, digest);
}
