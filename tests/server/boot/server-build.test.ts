import { execFile, execFileSync } from 'node:child_process';
import { mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, statSync, symlinkSync, utimesSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import { promisify } from 'node:util';

/** The server in one file: built when its files changed and only then, and each of its files still knows where it lies. */
jest.setTimeout(60_000);

const root = join(__dirname, '../../..');
let base = '';

beforeEach(() => {
  base = mkdtempSync(join(tmpdir(), 'evenfall-build-'));
  symlinkSync(join(root, 'node_modules'), join(base, 'node_modules'));
  mkdirSync(join(base, 'deep'));
  writeFileSync(join(base, 'main.ts'), "import { place } from './deep/place';\nconsole.log(place('first'));\n");
  writeFileSync(join(base, 'deep', 'place.ts'), 'export const place = (word: string): string => `${word} ${__dirname}`;\n');
});

afterEach(() => rmSync(base, { recursive: true }));

/** The folder of the build. */
function ensured(files = ['main.ts']): string {
  const module = pathToFileURL(join(root, 'scripts', 'lib', 'server-build.mjs')).href;
  const setting = JSON.stringify({ base, kept: join(base, 'kept'), files });
  const program = `import { ensureServerBuild } from ${JSON.stringify(module)}; console.log(await ensureServerBuild(${setting}));`;
  return execFileSync(process.execPath, ['--input-type=module', '-e', program], {
    encoding: 'utf8',
    stdio: ['ignore', 'pipe', 'pipe'],
  }).trim();
}

const run = (folder: string) => execFileSync(process.execPath, [join(folder, 'main.js')], { encoding: 'utf8' }).trim();

test('a file of the build knows the folder it was written in', () => {
  expect(run(ensured())).toBe(`first ${join(base, 'deep')}`);
});

test('what is unchanged is not built again; what changed, or is gone and back, is', () => {
  const first = ensured();
  const note = join(base, 'kept', 'build.json');
  const { mtimeMs } = statSync(note);
  expect(ensured()).toBe(first);
  expect(statSync(note).mtimeMs).toBe(mtimeMs);
  const path = join(base, 'deep', 'place.ts');
  writeFileSync(path, readFileSync(path, 'utf8').replace('${word}', 'second'));
  const second = ensured();
  expect(second).not.toBe(first);
  expect(run(second)).toBe(`second ${join(base, 'deep')}`);
  rmSync(path);
  expect(() => ensured()).toThrow(/Could not resolve/);
  expect(readdirSync(join(base, 'kept')).filter((name) => name.startsWith('new-'))).toEqual([]);
});

test('builds that a running server may still begin threads from are kept, older ones are not', () => {
  const folders = Array.from({ length: 6 }, (_, number) => {
    writeFileSync(join(base, 'main.ts'), `console.log(${number});\n`);
    utimesSync(join(base, 'main.ts'), 1000 + number, 1000 + number);
    const folder = ensured();
    utimesSync(folder, 2000 + number, 2000 + number);
    return folder;
  });
  const kept = readdirSync(join(base, 'kept')).filter((name) => name !== 'build.json');
  expect(kept.length).toBe(4);
  expect(run(folders[5] ?? '')).toBe('5');
  expect(run(folders[2] ?? '')).toBe('2');
});

test('a note that was cut short by a power cut means a new build, and builds at one time do not end each other', async () => {
  const folder = ensured();
  writeFileSync(join(base, 'kept', 'build.json'), '{"folder": "');
  expect(run(ensured())).toBe(`first ${join(base, 'deep')}`);
  writeFileSync(join(base, 'main.ts'), 'console.log(7);\n');
  const module = pathToFileURL(join(root, 'scripts', 'lib', 'server-build.mjs')).href;
  const setting = JSON.stringify({ base, kept: join(base, 'kept'), files: ['main.ts'] });
  const program = `import { ensureServerBuild } from ${JSON.stringify(module)}; console.log(await ensureServerBuild(${setting}));`;
  const all = await Promise.all(
    Array.from({ length: 6 }, () => promisify(execFile)(process.execPath, ['--input-type=module', '-e', program], { encoding: 'utf8' })),
  );
  const folders = new Set(all.map(({ stdout }) => stdout.trim()));
  expect(folders.size).toBe(1);
  expect(folders.has(folder)).toBe(false);
  expect(run([...folders][0] ?? '')).toBe('7');
});
