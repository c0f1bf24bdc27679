import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { root } from './paths.mjs';
import { must } from './run.mjs';
import { giveUp, say, waiting } from './say.mjs';

const read = (path) => JSON.parse(readFileSync(path, 'utf8'));

/** The first package that node_modules lacks or has in another version than the lock says, or null. */
function firstDifference() {
  const installedLock = join(root, 'node_modules', '.package-lock.json');
  if (!existsSync(installedLock)) return 'node_modules';
  const installed = read(installedLock).packages;
  for (const [path, wanted] of Object.entries(read(join(root, 'package-lock.json')).packages)) {
    if (path === '') continue;
    const found = installed[path];
    if (found === undefined ? !wanted.optional : found.version !== wanted.version || found.integrity !== wanted.integrity) return path;
  }
  return null;
}

/** Installs what package-lock.json names, unless node_modules already holds exactly that. */
export async function ensureNodeModules() {
  const [major] = process.versions.node.split('.').map(Number);
  if (major !== 20) giveUp(`Evenfall runs on Node.js 20; this is ${process.versions.node}.`);
  const difference = firstDifference();
  if (difference === null) return;
  say(`Installing the packages of package-lock.json, about a minute (first difference: ${difference}).`);
  await waiting('waiting for npm ci', () =>
    must('npm', ['ci', '--no-audit', '--no-fund', '--prefer-offline', '--maxsockets=60'], { cwd: root }),
  );
  const left = firstDifference();
  if (left !== null) giveUp(`npm ci ended well, yet ${left} is not as package-lock.json says.`);
}
