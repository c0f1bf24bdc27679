import { readFileSync, readdirSync } from 'node:fs';
import { dirname, join } from 'node:path';

const scripts = join(__dirname, '..', '..', 'scripts');

/** What a script reads before its first line runs: itself and all that it imports, in turn. */
function packagesAtOnce(path: string, seen = new Set<string>()): string[] {
  if (seen.has(path)) return [];
  seen.add(path);
  const wanted = [...readFileSync(path, 'utf8').matchAll(/^(?:import|export)\s[^;]*?from '([^']+)'/gm)].map(([, from = '']) => from);
  return wanted.flatMap((from) => {
    if (from.startsWith('node:')) return [];
    return from.startsWith('.') ? packagesAtOnce(join(dirname(path), from), seen) : [`${path.slice(scripts.length + 1)}: ${from}`];
  });
}

test('no script needs a package before it has installed them', () => {
  const entries = readdirSync(scripts).filter((name) => name.endsWith('.mjs'));
  expect(entries).toContain('start.mjs');
  expect(entries.flatMap((name) => packagesAtOnce(join(scripts, name)))).toEqual([]);
});
