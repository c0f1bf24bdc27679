import { execFileSync } from 'node:child_process';
import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';

const root = join(__dirname, '..', '..');

/** Every file of the tree that git knows or would take in, as paths from the root. */
export function trackedFiles(): string[] {
  const listed = execFileSync('git', ['ls-files', '-co', '--exclude-standard', '-z'], { cwd: root, encoding: 'utf8', maxBuffer: 1 << 26 });
  return listed.split('\0').filter((path) => path !== '' && existsSync(join(root, path)));
}

export const text = (path: string) => readFileSync(join(root, path), 'utf8');

const codeFolders = /^(app|components|server|shared|firmware-protocol|db|tests)\//;
export const codeFiles = () =>
  trackedFiles().filter((path) => codeFolders.test(path) && /\.(ts|tsx)$/.test(path) && !path.startsWith('db/migrations/'));
export const productFiles = () => codeFiles().filter((path) => !path.startsWith('tests/'));
